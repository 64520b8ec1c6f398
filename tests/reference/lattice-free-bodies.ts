// Random bodies for the reference tests of the lattice, and images of them: mirrored, moved, turned.

import { stream } from '../../shared/streams.js'
import type { LatticeSpec, NodeSpec } from '../../sim/lattice/spec.js'

export interface BodyOptions {
  readonly dimensions: 2 | 3
  /** Dashpots, drives and their groups; without them energy is kept. */
  readonly isAlive: boolean
  readonly stepSeconds?: number
}

const corners = (dimensions: 2 | 3) => (dimensions === 2 ? 3 : 4)

/** 6 to 13 nodes near a grid of 0.1 m, at random speeds, well braced, with some areas or volumes. In free flight. */
export function randomBody(
  seed: number,
  { dimensions, isAlive, stepSeconds = 2e-4 }: BodyOptions,
): LatticeSpec {
  const draw = stream(seed, 'spare', 9, 1, dimensions)
  const between = (low: number, high: number) => low + (high - low) * draw.uniform()
  const count = 6 + draw.below(8)
  const side = dimensions === 2 ? 4 : 3
  const nodes: NodeSpec[] = Array.from({ length: count }, (_, i) => {
    const cell = [i % side, Math.floor(i / side) % side, Math.floor(i / (side * side))].slice(0, dimensions)
    return {
      positionM: cell.map((place) => 0.1 * place + between(-0.03, 0.03)),
      velocityMps: cell.map(() => between(-0.3, 0.3)),
      massKg: between(0.005, 0.05),
    }
  })
  const struts = []
  for (let b = 1; b < count; b++) {
    const others = new Set([b - 1, draw.below(b), draw.below(b), draw.below(b)])
    for (const a of others) {
      struts.push({ a, b, stiffnessNpm: between(50, 500), dampingNspm: isAlive ? between(0, 0.3) : 0 })
    }
  }
  const actuators = isAlive
    ? struts.splice(0, 3).map((strut, i) => ({
        ...strut,
        group: i % 2,
        strain: between(0.02, 0.15),
        phaseTurns: between(0, 1),
        actuator: 'unlimited' as const,
      }))
    : []
  return {
    dimensions,
    nodes,
    struts,
    actuators,
    groups: isAlive ? [{ frequencyHz: between(0.5, 3) }, { frequencyHz: between(0.5, 3) }] : [],
    ...randomFills(nodes, draw, dimensions),
    gravityMps2: new Array<number>(dimensions).fill(0),
    stepSeconds,
  }
}

function randomFills(nodes: readonly NodeSpec[], draw: ReturnType<typeof stream>, dimensions: 2 | 3) {
  const fills: number[][] = []
  for (let i = 0; i + dimensions < nodes.length; i += 2) {
    const picked = Array.from({ length: corners(dimensions) }, (_, j) => i + j)
    const size = signedSize(picked.map((node) => nodes[node]!.positionM))
    if (Math.abs(size) < (dimensions === 2 ? 1e-3 : 1e-4)) continue
    fills.push(size > 0 ? picked : [picked[1]!, picked[0]!, ...picked.slice(2)])
  }
  const stiffness = 5 + 20 * draw.uniform()
  return dimensions === 2
    ? { areas: fills.map((n) => ({ nodes: n as [number, number, number], stiffnessNpm: stiffness })) }
    : {
        volumes: fills.map((n) => ({
          nodes: n as [number, number, number, number],
          stiffnessPa: 10 * stiffness,
        })),
      }
}

function signedSize(points: readonly (readonly number[])[]): number {
  const [p, q, r] = points.slice(1).map((point) => point.map((value, axis) => value - points[0]![axis]!))
  if (!r) return 0.5 * (p![0]! * q![1]! - p![1]! * q![0]!)
  const cross = (m: number, n: number) => q![m]! * r[n]! - q![n]! * r[m]!
  return (p![0]! * cross(1, 2) + p![1]! * cross(2, 0) + p![2]! * cross(0, 1)) / 6
}

/** The body with every position and velocity changed; areas and volumes keep their orientation if `flips` says so. */
export function imageOf(
  spec: LatticeSpec,
  place: (vector: readonly number[]) => readonly number[],
  turn: (vector: readonly number[]) => readonly number[],
  flips: boolean,
): LatticeSpec {
  const flip = <T extends readonly number[]>(nodes: T): T =>
    flips ? ([...nodes.slice(0, -2), nodes.at(-1), nodes.at(-2)] as unknown as T) : nodes
  return {
    ...spec,
    nodes: spec.nodes.map((node) => ({
      ...node,
      positionM: place(node.positionM),
      velocityMps: turn(node.velocityMps ?? node.positionM.map(() => 0)),
    })),
    areas: (spec.areas ?? []).map((area) => ({ ...area, nodes: flip(area.nodes) })),
    volumes: (spec.volumes ?? []).map((volume) => ({ ...volume, nodes: flip(volume.nodes) })),
    gravityMps2: turn(spec.gravityMps2),
  }
}
