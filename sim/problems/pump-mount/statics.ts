// How a lattice hangs or stands at rest under gravity, by Newton's method on its linear model (measure/linear-model.ts:
// springs with the stiffness that tension adds across). A state that gives way, because a part buckles or is a
// mechanism, has no positive definite stiffness and is told apart from one that is found.

import type { LatticeSpec } from '../../lattice/spec.js'
import { linearModel, part } from '../../measure/linear-model.js'
import { factorise } from '../../measure/semidefinite.js'

/** Each weight is put on in this many equal parts. */
const loadSteps = 2
const roundsMost = 20
/** Forces left over, as a share of the weight. */
const leftMost = 1e-12

/** The description at rest under so many times its weight: positions moved, rest lengths as they were; or nothing where it gives way. */
export function atRest(spec: LatticeSpec, weights = 1): LatticeSpec | undefined {
  let now = spec
  const steps = Math.ceil(loadSteps * weights)
  for (let step = 1; step <= steps; step++) {
    const settled = balance(now, (weights * step) / steps)
    if (!settled) return undefined
    now = settled
  }
  return now
}

/**
 * Frequency of the slowest mode of a mount at rest, Hz, by inverse iteration (von Mises and Pollaczek-Geiringer, 1929, from
 * memory): u <- K^-1 M u, and w^2 = u'Ku / u'Mu.
 */
export function slowestHz(rest: LatticeSpec): number {
  const { free, stiffness, size, dimensions, massKg } = linearModel(rest)
  const solver = factorise(part(stiffness, size, free, free), free.length)
  const mass = free.map((coordinate) => massKg[Math.floor(coordinate / dimensions)]!)
  // Leaning to one side, which no mode of a mount is blind to for long.
  let shape = Float64Array.from(free, (coordinate, i) => (coordinate % dimensions === 0 ? 1 : 1e-3 * (i + 1)))
  let squared = 0
  for (let round = 0; round < 20; round++) {
    const force = shape.map((one, i) => one * mass[i]!)
    const next = solver.solve(force)
    // K next = M shape: next'K next = next'M shape.
    let [above, below] = [0, 0]
    for (let i = 0; i < next.length; i++) {
      above += next[i]! * force[i]!
      below += next[i]! * next[i]! * mass[i]!
    }
    squared = above / below
    const scale = 1 / Math.sqrt(below)
    shape = next.map((one) => one * scale)
  }
  return Math.sqrt(squared) / (2 * Math.PI)
}

function balance(spec: LatticeSpec, share: number): LatticeSpec | undefined {
  let now = spec
  const weightN = spec.nodes.reduce((sum, { massKg }) => sum + massKg, 0) * Math.abs(spec.gravityMps2[1]!)
  for (let round = 0; round < roundsMost; round++) {
    const { free, stiffness, size, dimensions } = linearModel(now)
    const forces = forcesN(now, share)
    const open = free.map((coordinate) => forces[coordinate]!)
    const left = open.reduce((most, force) => Math.max(most, Math.abs(force)), 0)
    const solver = factorise(part(stiffness, size, free, free), free.length)
    if (solver.rank < free.length) return undefined
    if (left <= leftMost * weightN) return now
    const moves = solver.solve(open)
    const positions = now.nodes.map(({ positionM }) => [...positionM])
    for (const [i, coordinate] of free.entries()) {
      positions[Math.floor(coordinate / dimensions)]![coordinate % dimensions]! += moves[i]!
    }
    now = { ...now, nodes: now.nodes.map((node, i) => ({ ...node, positionM: positions[i]! })) }
  }
  return undefined
}

/** Spring forces and a share of the weight on every coordinate, node by node, N. */
function forcesN({ nodes, struts, gravityMps2 }: LatticeSpec, share: number): Float64Array {
  const forces = new Float64Array(2 * nodes.length)
  for (const [i, { massKg }] of nodes.entries()) forces[2 * i + 1] = share * massKg * gravityMps2[1]!
  for (const { a, b, restM, stiffnessNpm } of struts) {
    const [dx, dy] = [0, 1].map((axis) => nodes[b]!.positionM[axis]! - nodes[a]!.positionM[axis]!) as [
      number,
      number,
    ]
    const lengthM = Math.sqrt(dx * dx + dy * dy)
    const scale = (stiffnessNpm * (lengthM - restM!)) / lengthM
    forces[2 * a]! += scale * dx
    forces[2 * a + 1]! += scale * dy
    forces[2 * b]! -= scale * dx
    forces[2 * b + 1]! -= scale * dy
  }
  return forces
}
