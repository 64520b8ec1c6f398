// The replay: a block of a few cells between two plates that it sticks to, the upper one going down to the working
// squeeze. Unlike the measured cell it has edges: its outer walls are whole, and its sides are free.

import type { Frames, Situation as ProblemSituation } from '../../../shared/problem.js'
import {
  buildFramework,
  equilibrate,
  type Framework,
  type FrameworkSpec,
  type Point,
  situationOf,
} from '../../frames/index.js'
import type { CellWall } from './cell.js'
import { type PadGenome, wallKinds } from './genome.js'
import { numbers } from './numbers.js'
import { type CastingCondition, describeCell } from './trial.js'

interface Block {
  readonly spec: FrameworkSpec
  readonly kinds: readonly string[]
  /** Nodes on the lower and on the upper plate. */
  readonly lower: readonly number[]
  readonly upper: readonly number[]
}

interface BlockWall {
  readonly a: number
  readonly b: number
  readonly wall: number
}

const { across, up } = numbers.blockCells
/** Nodes of the block lie on a grid; node (i, j) is columns * j + i. */
const columns = 4 * across + 1
const rows = 4 * up + 1

/** Walls of the cells of the block; those on the right and upper edge are repeated there. */
function wallsOfBlock(walls: readonly CellWall[]): BlockWall[] {
  const found: BlockWall[] = []
  for (let q = 0; q <= up; q++) {
    for (let p = 0; p <= across; p++) {
      for (const [wall, { a, b, shift }] of walls.entries()) {
        const [ai, aj] = [4 * p + (a % 4), 4 * q + Math.floor(a / 4)]
        const [bi, bj] = [4 * (p + shift[0]) + (b % 4), 4 * (q + shift[1]) + Math.floor(b / 4)]
        const inside = (i: number, most: number) => i >= 0 && i < most
        if (inside(ai, columns) && inside(bi, columns) && inside(aj, rows) && inside(bj, rows)) {
          found.push({ a: columns * aj + ai, b: columns * bj + bi, wall })
        }
      }
    }
  }
  return found
}

/** The walls of the largest piece: at its edges a block may have pieces that hung on its neighbours. */
function largestPiece(walls: readonly BlockWall[]): BlockWall[] {
  const piece = new Map<number, number>()
  const rootOf = (node: number): number => {
    let root = node
    while (piece.get(root) !== undefined && piece.get(root) !== root) root = piece.get(root)!
    return root
  }
  for (const { a, b } of walls) piece.set(rootOf(b), rootOf(a))
  const sizes = new Map<number, number>()
  for (const { a } of walls) sizes.set(rootOf(a), (sizes.get(rootOf(a)) ?? 0) + 1)
  const [largest] = [...sizes].reduce((best, one) => (one[1] > best[1] ? one : best), [-1, 0])
  return walls.filter(({ a }) => rootOf(a) === largest)
}

/** The cells of the block as one framework, nodes row by row. */
function blockOf(genome: PadGenome, casting: CastingCondition): Block | undefined {
  const { cell, bars } = describeCell(genome, casting)
  const walls = largestPiece(wallsOfBlock(cell.walls))
  if (walls.length === 0) return undefined
  const order = [...new Set(walls.flatMap(({ a, b }) => [a, b]))].sort((a, b) => a - b)
  const place = new Map(order.map((key, i) => [key, i]))
  const rowOf = (key: number) => Math.floor(key / columns)
  const onRow = (row: number) => order.filter((key) => rowOf(key) === row).map((key) => place.get(key)!)
  return {
    spec: {
      nodes: order.map((key): Point => {
        const [i, j] = [key % columns, rowOf(key)]
        const node = 4 * (j % 4) + (i % 4)
        const [x, y] = cell.nodesM[node]!
        return [
          Math.floor(i / 4) * cell.widthM + x + casting.placeOffsetsM[2 * node]!,
          Math.floor(j / 4) * cell.heightM + y + casting.placeOffsetsM[2 * node + 1]!,
        ]
      }),
      bars: walls.map(({ a, b, wall }) => {
        const { shift: _, ...bar } = bars[wall]!
        return { ...bar, a: place.get(a)!, b: place.get(b)! }
      }),
    },
    kinds: walls.map(({ wall }) => `${wallKinds[cell.walls[wall]!.kind]} wall`),
    lower: onRow(rowOf(order[0]!)),
    upper: onRow(rowOf(order.at(-1)!)),
  }
}

/** Frames of the squeeze: down to the working squeeze and held there. Ends early where no equilibrium is found. */
export function padFrames(genome: PadGenome, { condition }: ProblemSituation<CastingCondition>): Frames {
  const block = blockOf(genome, condition)
  if (!block) return emptyFrames
  const { spec, kinds, lower, upper } = block
  const positions: Float64Array[] = []
  const framework = buildFramework(spec)
  const xs = spec.nodes.map(([x]) => x)
  const most = (nodes: readonly number[], sign: number) =>
    nodes.reduce((best, node) => Math.max(best, sign * spec.nodes[node]![1]), Number.NEGATIVE_INFINITY)
  const [lowM, topM] = [-most(lower, -1), most(upper, 1)]
  const left = xs.reduce((a, b) => Math.min(a, b))
  const right = xs.reduce((a, b) => Math.max(a, b))
  const marginM = 0.1 * (right - left)
  const show = (u: Float64Array, down: number) => {
    const frame = new Float64Array(2 * spec.nodes.length + 4)
    for (const [i, [x, y]] of spec.nodes.entries()) {
      frame[2 * i] = x + u[framework.nodeUnknown[i]!]!
      frame[2 * i + 1] = y - lowM + u[framework.nodeUnknown[i]! + 1]!
    }
    const plateM = topM - lowM - down
    frame.set([left - marginM, plateM, right + marginM, plateM], 2 * spec.nodes.length)
    positions.push(frame)
  }
  squeezeBlock(framework, block, topM - lowM, show)
  const plate = spec.nodes.length
  return {
    dimensions: 2,
    secondsPerFrame: 1 / numbers.framesPerSecond,
    positions,
    links: [
      ...spec.bars.map(({ a, b }, i) => ({ a, b, kind: kinds[i]!, weight: weights[kinds[i]!] ?? 0 })),
      { a: plate, b: plate + 1, kind: 'plate', weight: 1 },
    ],
    nodeRadiiM: [...spec.nodes.map(() => 0.001), 0.0005, 0.0005],
    ground: [
      [left - marginM, 0],
      [right + marginM, 0],
    ],
    markers: [],
    drive: [],
  }
}

/** How bold a wall is drawn. */
const weights: { readonly [kind: string]: number } = { 'thin wall': 0, 'middle wall': 0.4, 'thick wall': 0.8 }

const emptyFrames: Frames = {
  dimensions: 2,
  secondsPerFrame: 1 / numbers.framesPerSecond,
  positions: [new Float64Array(0)],
  links: [],
  nodeRadiiM: [],
  ground: [],
  markers: [],
  drive: [],
}

function squeezeBlock(
  framework: Framework,
  { lower, upper }: Block,
  heightM: number,
  show: (u: Float64Array, down: number) => void,
): void {
  const at = framework.nodeUnknown
  const held = [...lower, ...upper].flatMap((node) => [at[node]!, at[node]! + 1])
  const situation = situationOf(framework, held)
  show(situation.u, 0)
  const moving = Math.round((2 / 3) * numbers.frameCount)
  const increments = new Float64Array(framework.unknownCount)
  const stepM = (numbers.workingSqueeze * heightM) / moving
  for (const node of upper) increments[at[node]! + 1] = -stepM
  for (let frame = 1; frame < numbers.frameCount; frame++) {
    if (frame <= moving && 'reason' in equilibrate(situation, increments)) return
    show(situation.u, Math.min(frame, moving) * stepM)
  }
}
