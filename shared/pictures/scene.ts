// What is drawn, made ready once: looks of kinds, the space that the run takes, where the machine's middle is. A scene
// belongs to its frames and never changes; a view (view.ts) and a moment (moment.ts) make a picture of it.

import type { Frames } from '../frames.js'
import { type Box, BoxMaker, middleOf, moved, type Point } from './boxes.js'
import { type GroundHeight, groundHeight } from './ground.js'
import { type KindLook, kindLooks } from './looks.js'
import { cornersOf } from './moment.js'

export interface Scene {
  readonly frames: Frames
  readonly nodeCount: number
  readonly lastFrame: number
  readonly kinds: readonly KindLook[]
  /** Labels of bodies in order of appearance. */
  readonly bodyLabels: readonly { readonly label: string; readonly role: 'machine' | 'load' }[]
  readonly height: GroundHeight | undefined
  /** Everything worth showing over the whole run: the machine's way, loads at the start, walls and ground beside it. */
  readonly wayBox: Box
  /** The machine's way alone. */
  readonly ownWayBox: Box
  /** The machine over the whole run, seen from its own middle. */
  readonly machineBox: Box
  /** The machine's middle in each frame, averaged over a second so that a gait does not shake the view: x, y, z. */
  readonly middlesM: Float64Array
  /** Mean length of the links in the first frame; 0 without links. */
  readonly meanLinkM: number
}

/** The frames must be sound (framesFault). */
export function sceneOf(frames: Frames): Scene {
  const nodeCount = frames.positions[0]!.length / frames.dimensions
  const lastFrame = frames.positions.length - 1
  const raw = rawMiddles(frames, nodeCount)
  const middlesM = smoothed(raw, Math.max(1, Math.round(0.5 / frames.secondsPerFrame)))
  const labels = new Map((frames.bodies ?? []).map(({ label, role }) => [label, { label, role }]))
  const scene = { frames, nodeCount, lastFrame, middlesM, height: groundHeight(frames) }
  const { way, machine } = boxesOf(scene)
  return {
    ...scene,
    kinds: kindLooks(frames),
    bodyLabels: [...labels.values()],
    wayBox: boxWorthSeeing(frames) ?? withSurroundings(way, scene),
    ownWayBox: way,
    machineBox: machine,
    meanLinkM: meanLink(frames),
  }
}

/** Calls `visit` with every node's place in a frame. */
function eachNode(
  frames: Frames,
  frame: number,
  visit: (x: number, y: number, z: number, node: number) => void,
) {
  const positions = frames.positions[frame]!
  const stride = frames.dimensions
  for (let node = 0, at = 0; at < positions.length; node++, at += stride)
    visit(positions[at]!, positions[at + 1]!, stride === 3 ? positions[at + 2]! : 0, node)
}

/** Mean place of the nodes, or of the machine's bodies where there are no nodes. */
function rawMiddles(frames: Frames, nodeCount: number): Float64Array {
  const middles = new Float64Array(3 * frames.positions.length)
  const bodies = frames.bodies ?? []
  const machine = bodies.some(({ role }) => role === 'machine')
    ? bodies.filter(({ role }) => role === 'machine')
    : bodies
  for (let frame = 0; frame < frames.positions.length; frame++) {
    const add = (x: number, y: number, z: number, share: number) => {
      middles[3 * frame] = middles[3 * frame]! + x * share
      middles[3 * frame + 1] = middles[3 * frame + 1]! + y * share
      middles[3 * frame + 2] = middles[3 * frame + 2]! + z * share
    }
    eachNode(frames, frame, (x, y, z) => add(x, y, z, 1 / nodeCount))
    if (nodeCount > 0) continue
    for (const { poses } of machine) {
      const pose = poses[frame]!
      add(pose[0]!, pose[1]!, pose.length === 7 ? pose[2]! : 0, 1 / machine.length)
    }
  }
  return middles
}

function smoothed(values: Float64Array, half: number): Float64Array {
  const count = values.length / 3
  return values.map((_, at) => {
    const [frame, axis] = [Math.floor(at / 3), at % 3]
    const [from, to] = [Math.max(0, frame - half), Math.min(count - 1, frame + half)]
    let sum = 0
    for (let one = from; one <= to; one++) sum += values[3 * one + axis]!
    return sum / (to - from + 1)
  })
}

type Early = Pick<Scene, 'frames' | 'nodeCount' | 'lastFrame' | 'middlesM' | 'height'>

function boxesOf(scene: Early): { readonly way: Box; readonly machine: Box } {
  const [way, machine] = [new BoxMaker(), new BoxMaker()]
  for (let frame = 0; frame <= scene.lastFrame; frame++) {
    const one = machineBoxAt(scene, frame)
    const [x, y, z] = scene.middlesM.subarray(3 * frame, 3 * frame + 3)
    if (one === undefined) continue
    way.addBox(one)
    machine.addBox(moved(one, [-x!, -y!, -z!]))
  }
  addBodies(scene.frames, 0, 'load', way)
  const found = way.box()!
  const own = machine.box()
  return { way: found, machine: own ?? moved(found, negative(middleOf(found))) }
}

function negative([x, y, z]: Point): Point {
  return [-x, -y, -z]
}

function machineBoxAt({ frames }: Early, frame: number): Box | undefined {
  const maker = new BoxMaker()
  eachNode(frames, frame, (x, y, z, node) => maker.add(x, y, z, frames.nodeRadiiM[node]))
  const positions = frames.positions[frame]!
  for (const { node, radiusM } of frames.markers) {
    const at = node * frames.dimensions
    maker.add(positions[at]!, positions[at + 1]!, frames.dimensions === 3 ? positions[at + 2]! : 0, radiusM)
  }
  addBodies(frames, frame, 'machine', maker)
  return maker.box()
}

function addBodies(frames: Frames, frame: number, role: 'machine' | 'load', maker: BoxMaker): void {
  for (const body of frames.bodies ?? []) {
    if (body.role !== role) continue
    const corners = cornersOf(body, body.poses[frame]!)
    for (let i = 0; i < corners.length; i += 3)
      maker.add(corners[i]!, corners[i + 1]!, corners[i + 2]!, body.radiusM ?? 0)
  }
}

function boxWorthSeeing({ worthSeeing }: Frames): Box | undefined {
  if (worthSeeing === undefined) return undefined
  const point = (place: readonly number[]): Point => [place[0]!, place[1]!, place[2] ?? 0]
  return { low: point(worthSeeing.lowM), high: point(worthSeeing.highM) }
}

/** Ground and walls beside the way count up and down (and across), not along: they may be far longer than the way. */
function withSurroundings(way: Box, { frames, height }: Early): Box {
  const maker = new BoxMaker()
  maker.addBox(way)
  const [low, high] = [way.low[0], way.high[0]]
  const clamped = (x: number) => Math.min(high, Math.max(low, x))
  // In 3-D a piece of a wide pipe's wall is enough to see where one is; in 2-D all of it must be in view.
  const within = (value: number, axis: 1 | 2, times: number) => {
    if (frames.dimensions === 2) return value
    const room = times * Math.max(way.high[1] - way.low[1], way.high[2] - way.low[2])
    return Math.min(way.high[axis] + room, Math.max(way.low[axis] - room, value))
  }
  if (height !== undefined) {
    const samples = 64
    for (let i = 0; i <= samples; i++) {
      const x = low + ((high - low) * i) / samples
      for (const z of [way.low[2], way.high[2]]) maker.add(x, height(x, z), z)
    }
  }
  for (const { atM } of frames.labels ?? []) {
    const [x, y, z] = [atM[0]!, atM[1]!, atM[2] ?? 0]
    if (x >= low && x <= high) maker.add(x, y, z)
  }
  for (const { pointsM } of frames.walls ?? []) {
    for (const [a, b] of wallPieces(pointsM, frames.dimensions)) {
      if (Math.max(a[0], b[0]) < low || Math.min(a[0], b[0]) > high) continue
      const at = (x: number) => (b[0] === a[0] ? 0 : (clamped(x) - a[0]) / (b[0] - a[0]))
      for (const [share, end] of [
        [at(a[0]), a],
        [at(b[0]), b],
      ] as const) {
        const [y, z] =
          b[0] === a[0] ? [end[1], end[2]] : [a[1] + share * (b[1] - a[1]), a[2] + share * (b[2] - a[2])]
        maker.add(clamped(end[0]), within(y, 1, 0.9), within(z, 2, 0.4))
      }
    }
  }
  return maker.box()!
}

/** The straight pieces of a wall, as points with z (0 in 2-D). */
export function wallPieces(pointsM: readonly number[], dimensions: 2 | 3): (readonly [Point, Point])[] {
  const points: Point[] = []
  for (let i = 0; i < pointsM.length; i += dimensions)
    points.push([pointsM[i]!, pointsM[i + 1]!, dimensions === 3 ? pointsM[i + 2]! : 0])
  return points.slice(1).map((point, i) => [points[i]!, point] as const)
}

function meanLink(frames: Frames): number {
  const positions = frames.positions[0]!
  const stride = frames.dimensions
  let sum = 0
  for (const { a, b } of frames.links) {
    let square = 0
    for (let axis = 0; axis < stride; axis++) {
      const apart = positions[b * stride + axis]! - positions[a * stride + axis]!
      square += apart * apart
    }
    sum += Math.sqrt(square)
  }
  return frames.links.length > 0 ? sum / frames.links.length : 0
}
