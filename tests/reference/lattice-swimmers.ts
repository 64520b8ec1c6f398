// Swimmers of drag rods for the reference tests: Purcell's three links with two driven joints.

import { advance } from '../../sim/lattice/advance.js'
import { buildLattice, type Lattice } from '../../sim/lattice/build.js'
import type { GuidedSpec, NodeSpec, StrutSpec } from '../../sim/lattice/spec.js'

/**
 * Angles of the two joints at phase 0 to 1 of a closed path. The links are 1 m long; a joint is driven by guided struts
 * between outriggers on either side of the links, and one between the far ends of the links: together they hold it at
 * every angle up to 120 degrees both ways, where each alone has dead points.
 */
export type Stroke = (phase: number) => readonly [number, number]

export interface Swimmer {
  readonly normalNspm2: number
  readonly tangentNspm2: number
  /** Mass of every node: inertia is m w / b of drag. */
  readonly nodeKg: number
  readonly strokeSeconds: number
}

interface Pose {
  readonly nodes: readonly (readonly [number, number])[]
}

/** Nodes 0 to 3 along the links, then left and right outrigger of every link; middle link centred on the x axis. */
function poseOf([first, second]: readonly [number, number]): Pose {
  const at = (angle: number) => [Math.cos(angle), Math.sin(angle)] as const
  const [a, b] = [at(-first), at(second)]
  const joints = [
    [-0.5 - a[0], -a[1]],
    [-0.5, 0],
    [0.5, 0],
    [0.5 + b[0], b[1]],
  ] as const
  const outriggers = [0, 1, 2].flatMap((link) => {
    const [from, to] = [joints[link]!, joints[link + 1]!]
    const [dx, dy] = [to[0] - from[0], to[1] - from[1]]
    // Unlike, so that no two of them ever meet.
    const along = [0.7, 0.5, 0.3][link]!
    const foot = [from[0] + along * dx, from[1] + along * dy] as const
    return [
      [foot[0] - dy / 2, foot[1] + dx / 2],
      [foot[0] + dy / 2, foot[1] - dx / 2],
    ] as const
  })
  return { nodes: [...joints, ...outriggers] }
}

/** Far ends, left outriggers, right outriggers of each joint. */
const driven = [
  [0, 2],
  [1, 3],
  [4, 6],
  [5, 7],
  [6, 8],
  [7, 9],
] as const

function lengthsOf({ nodes }: Pose): number[] {
  return driven.map(([a, b]) => Math.hypot(nodes[b]![0] - nodes[a]![0], nodes[b]![1] - nodes[a]![1]))
}

/** Places of the driven joints do not enter where the body swims in: x, y of the middle of the middle link. */
function centreOf({ nodes, stride }: Lattice): readonly [number, number] {
  const middle = (axis: number) => (nodes[stride + axis]! + nodes[2 * stride + axis]!) / 2
  return [middle(0), middle(1)]
}

function buildSwimmer(swimmer: Swimmer, stroke: Stroke, stepSeconds: number | 'auto'): Lattice {
  const { nodeKg, normalNspm2, tangentNspm2 } = swimmer
  const pose = poseOf(stroke(0))
  // As stiff as the mass allows at a step of about m / (4 b).
  const stiffnessNpm = 4 / nodeKg
  const dampingNspm = 0.3
  const nodes: NodeSpec[] = pose.nodes.map((positionM) => ({ positionM, massKg: nodeKg }))
  const struts: StrutSpec[] = [0, 1, 2].flatMap((link) => {
    const [left, right] = [4 + 2 * link, 5 + 2 * link]
    const bars = [
      [link, link + 1],
      [link, left],
      [link + 1, left],
      [link, right],
      [link + 1, right],
      [left, right],
    ] as const
    return bars.map(([a, b]) => ({ a, b, stiffnessNpm, dampingNspm }))
  })
  const lengths = lengthsOf(pose)
  const guided: GuidedSpec[] = driven.map(([a, b], i) => ({
    a,
    b,
    restM: lengths[i]!,
    stiffnessNpm,
    dampingNspm,
    actuator: 'unlimited',
  }))
  const dragStruts = [0, 1, 2].map((a) => ({ a, b: a + 1, normalNspm2, tangentNspm2 }))
  return buildLattice({ nodes, struts, guided, dragStruts, gravityMps2: [0, 0], stepSeconds })
}

/**
 * How far and whereto the middle of the body has come after one stroke, m: x, y in the frame of the middle link at the
 * start. Lengths are set every `every` steps to where the stroke is in the middle of them.
 */
export function swim(swimmer: Swimmer, stroke: Stroke, every = 20): readonly [number, number] {
  const longest = buildSwimmer(swimmer, stroke, 'auto').stepSeconds
  const pieces = Math.ceil(swimmer.strokeSeconds / longest / every)
  const lattice = buildSwimmer(swimmer, stroke, swimmer.strokeSeconds / pieces / every)
  const start = centreOf(lattice)
  const rests = lattice.restM.slice(lattice.passiveCount)
  for (let piece = 0; piece < pieces; piece++) {
    for (const [i, length] of lengthsOf(poseOf(stroke((piece + 1) / pieces))).entries()) {
      lattice.hostStrain[i] = length / rests[i]! - 1
    }
    const fault = advance(lattice, every)
    if (fault) throw new Error(fault.reason)
  }
  // The last inertia dies away.
  advance(lattice, Math.round((20 * swimmer.nodeKg) / swimmer.tangentNspm2 / lattice.stepSeconds))
  const end = centreOf(lattice)
  return [end[0] - start[0], end[1] - start[1]]
}

/** Joint angles (-A, -A), (A, -A), (A, A), (-A, A) and back, each side in a quarter of the time, gently at the corners. */
export function squareStroke(amplitude: number): Stroke {
  const smooth = (s: number) => s * s * (3 - 2 * s)
  const corners = [
    [-1, -1],
    [1, -1],
    [1, 1],
    [-1, 1],
    [-1, -1],
  ] as const
  return (phase) => {
    const side = Math.min(3, Math.floor(4 * phase))
    const s = smooth(4 * phase - side)
    const [from, to] = [corners[side]!, corners[side + 1]!]
    return [0, 1].map((i) => amplitude * (from[i]! + s * (to[i]! - from[i]!))) as [number, number]
  }
}
