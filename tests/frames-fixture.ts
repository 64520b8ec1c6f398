// Made-up machines in motion, for tests of pictures: a truss in 2-D, a truss in 3-D inside a pipe, a linkage of rigid
// pieces that moves debris, and a body of many struts. Nothing here is simulated; shapes move by formulas.

import type { FrameBody, FrameLink, Frames, FrameWall } from '../shared/frames.js'

const secondsPerFrame = 0.04

export interface TrussShape {
  readonly bays: number
  /** Chains of nodes across; 1 makes it flat. */
  readonly chains: number
  readonly frames: number
}

const bayM = 0.06
const heightM = 0.06
const apartM = 0.055

/** A truss that crawls to the right at 60 mm/s with a wave running along it, its lower nodes touching when they are down. */
export function trussFrames({ bays, chains, frames }: TrussShape): Frames {
  const dimensions = chains === 1 ? 2 : 3
  const columns = bays + 1
  const node = (column: number, level: 0 | 1, chain: number) => (chain * columns + column) * 2 + level
  const { links, driven } = trussLinks(columns, chains, node)
  const positions: Float64Array[] = []
  const contacts: Uint8Array[] = []
  for (let frame = 0; frame < frames; frame++) {
    const places = new Float64Array(2 * columns * chains * dimensions)
    const touches = new Uint8Array(2 * columns * chains)
    for (let chain = 0; chain < chains; chain++) {
      for (let column = 0; column < columns; column++) {
        const wave = Math.sin(0.25 * frame - 0.9 * column - 0.7 * chain)
        const lift = Math.max(0, 0.012 * wave)
        for (const level of [0, 1] as const) {
          const at = node(column, level, chain) * dimensions
          places[at] = column * bayM + 0.06 * secondsPerFrame * frame + 0.004 * wave
          places[at + 1] = lift + level * (heightM + 0.006 * wave)
          if (dimensions === 3) places[at + 2] = (chain - (chains - 1) / 2) * apartM
        }
        touches[node(column, 0, chain)] = lift === 0 ? 1 : 0
      }
    }
    positions.push(places)
    contacts.push(touches)
  }
  return {
    dimensions,
    secondsPerFrame,
    positions,
    links,
    nodeRadiiM: Array.from({ length: 2 * columns * chains }, () => 0.004),
    ground: groundLine,
    markers: [
      {
        node: node(Math.floor(columns / 2), 1, Math.floor(chains / 2)),
        label: 'sensor puck',
        radiusM: 0.016,
      },
    ],
    drive: driven.map((link, i) => ({
      link,
      values: Float64Array.from({ length: frames }, (_, frame) => Math.sin(0.25 * frame - 0.9 * (i % 4))),
    })),
    contacts,
    walls: dimensions === 2 ? [flatPipe] : pipeWalls(),
  }
}

const groundLine = Array.from({ length: 121 }, (_, i) => {
  const x = -1 + 0.025 * i
  return [x, i % 17 === 0 && x > 0.5 ? 0.012 : 0] as const
})
const flatPipe: FrameWall = { label: 'pipe crown', pointsM: [-1, 0.16, 3, 0.16], solid: 'left' }

function trussLinks(
  columns: number,
  chains: number,
  node: (column: number, level: 0 | 1, chain: number) => number,
) {
  const links: FrameLink[] = []
  const driven: number[] = []
  const passive = (a: number, b: number, kind: 'soft' | 'firm' | 'hard') =>
    links.push({ a, b, kind, weight: { soft: 0, firm: 0.5, hard: 1 }[kind] })
  for (let chain = 0; chain < chains; chain++) {
    for (let column = 0; column < columns; column++) {
      passive(node(column, 0, chain), node(column, 1, chain), 'firm')
      if (chain > 0) {
        passive(node(column, 0, chain - 1), node(column, 0, chain), 'soft')
        passive(node(column, 1, chain - 1), node(column, 1, chain), 'soft')
      }
      if (column === 0) continue
      passive(node(column - 1, 0, chain), node(column, 0, chain), 'hard')
      passive(node(column - 1, 1, chain), node(column, 1, chain), 'soft')
      driven.push(links.length)
      const group = 1 + (column % 4)
      links.push({ a: node(column - 1, 0, chain), b: node(column, 1, chain), kind: `actuator ${group}` })
    }
  }
  return { links, driven }
}

/** A pipe of 0.3 m bore as rings and lines along it; its lowest line lies on the ground. */
function pipeWalls(): FrameWall[] {
  const radiusM = 0.15
  const around = (i: number) => [
    radiusM - radiusM * Math.cos((i * Math.PI) / 12),
    radiusM * Math.sin((i * Math.PI) / 12),
  ]
  const rings = Array.from({ length: 9 }, (_, ring) => ({
    label: 'pipe wall',
    pointsM: Array.from({ length: 25 }, (_, i) => [-0.1 + 0.15 * ring, ...around(i)]).flat(),
  }))
  const along = [4, 8, 12, 16, 20].map((i) => ({
    label: 'pipe wall',
    pointsM: [-0.1, ...around(i), 1.1, ...around(i)],
  }))
  return [...rings, ...along]
}

/** A crank turns, a rod follows, a rake's arm swings; three pieces of debris wait at a screen. */
export function linkageFrames(frames = 101): Frames {
  const crankM = 0.12
  const pose = (x: number, y: number, angle: number) => Float64Array.of(x, y, angle)
  const turn = (frame: number) => (2 * Math.PI * frame) / 50
  const series = (make: (frame: number) => Float64Array) =>
    Array.from({ length: frames }, (_, frame) => make(frame))
  const pin = (frame: number) =>
    [crankM * Math.cos(turn(frame)), 0.5 + crankM * Math.sin(turn(frame))] as const
  const bodies: FrameBody[] = [
    {
      label: 'crank',
      role: 'machine',
      cornersM: [0, 0, crankM, 0],
      radiusM: 0.018,
      poses: series((frame) => pose(0, 0.5, turn(frame))),
    },
    {
      label: 'rake arm',
      role: 'machine',
      cornersM: [-0.02, 0.02, -0.02, -0.42, 0.1, -0.45, 0.1, -0.42, 0.02, -0.4, 0.02, 0.02],
      poses: series((frame) => pose(...pin(frame), 0.35 * Math.sin(turn(frame)))),
    },
    ...[0.3, 0.36, 0.44].map(
      (x, i): FrameBody => ({
        label: 'debris',
        role: 'load',
        cornersM: i === 1 ? [-0.02, -0.02, 0.03, -0.015, 0.01, 0.03] : [0, 0],
        radiusM: i === 1 ? 0 : 0.022,
        poses: series((frame) => pose(x + 0.0008 * frame, 0.022 + 0.0004 * i * frame, -0.02 * frame)),
      }),
    ),
  ]
  return {
    dimensions: 2,
    secondsPerFrame,
    positions: series(() => Float64Array.of(0, 0.5)).map((first, frame) =>
      Float64Array.of(...first, ...pin(frame)),
    ),
    links: [],
    nodeRadiiM: [0.01, 0.01],
    ground: [
      [-2, 0],
      [2, 0],
    ],
    markers: [],
    drive: [],
    bodies,
    motors: [
      {
        node: 1,
        label: 'slide motor',
        values: Float64Array.from({ length: frames }, (_, f) => Math.cos(f / 9)),
        slidesFrom: 0,
      },
      {
        node: 0,
        label: 'crank motor',
        values: Float64Array.from({ length: frames }, (_, f) => Math.sin(f / 9)),
      },
    ],
    walls: [
      ...[0, 1, 2, 3].map((i) => ({
        label: 'intake screen',
        pointsM: [0.55 + 0.05 * i, 0, 0.62 + 0.05 * i, 0.6],
      })),
      { label: 'channel wall', pointsM: [-0.35, 0.72, -0.35, 0], solid: 'right' },
    ],
    labels: [{ text: 'intake', atM: [0.72, 0.55] }],
  }
}

/** A box that tumbles over the floor, and a ball: rigid pieces in 3-D. */
export function solidFrames(frames = 60): Frames {
  const [a, b, c] = [0.06, 0.03, 0.04]
  const corners = [-1, 1].flatMap((x) => [-1, 1].flatMap((y) => [-1, 1].map((z) => [a * x, b * y, c * z])))
  const faces = [
    [0, 1, 3, 2],
    [4, 5, 7, 6],
    [0, 1, 5, 4],
    [2, 3, 7, 6],
    [0, 2, 6, 4],
    [1, 3, 7, 5],
  ]
  const poses = (x: number, z: number) =>
    Array.from({ length: frames }, (_, frame) =>
      Float64Array.of(x + 0.004 * frame, 0.08, z, 0, Math.sin(0.03 * frame), 0, Math.cos(0.03 * frame)),
    )
  return {
    dimensions: 3,
    secondsPerFrame,
    positions: Array.from({ length: frames }, () => new Float64Array(0)),
    links: [],
    nodeRadiiM: [],
    ground: [],
    markers: [],
    drive: [],
    bodies: [
      { label: 'hull', role: 'machine', cornersM: corners.flat(), faces, poses: poses(0, 0) },
      { label: 'stone', role: 'load', cornersM: [0, 0, 0], radiusM: 0.02, poses: poses(0.15, 0.06) },
    ],
    groundGrid: {
      firstXM: -0.5,
      firstZM: -0.5,
      spacingXM: 0.1,
      spacingZM: 0.1,
      countX: 16,
      countZ: 11,
      heightsM: Float64Array.from({ length: 176 }, (_, i) => 0.01 * Math.sin(i)),
    },
  }
}
