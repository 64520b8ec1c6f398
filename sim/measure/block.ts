// Effective modulus and Poisson's ratio of a finite block of a lattice, as a testing machine finds them: one face on
// rollers, the opposite one moved along its normal on rollers, everything else free; small displacements.
//   E = (force / face) / (displacement / length),   nu = -(mean lateral strain) / (axial strain)
// Length, faces and lateral strains are those of the nodes' bounding box, the lateral strain between the mean motions
// of the nodes on its opposite faces. Source: common practice of material testing.

import { refuse } from '../../shared/refusals.js'
import type { LatticeSpec } from '../lattice/spec.js'
import { type LinearModel, linearModel, part } from './linear-model.js'
import { factorise } from './semidefinite.js'

export interface BlockModuli {
  /** N/m in 2-D (unit thickness), Pa in 3-D. */
  readonly modulus: number
  /** Towards the other axes in order. */
  readonly poisson: readonly number[]
  /** Force for a unit displacement of the face, N/m. */
  readonly stiffnessNpm: number
  /** Motion of every coordinate for a unit displacement of the face. */
  readonly motion: Float64Array
  /** Motions besides rigid ones that the rollers allow and nothing resists. */
  readonly mechanisms: number
}

interface Face {
  readonly atM: number
  readonly nodes: readonly number[]
}

/** Moduli of the block along one axis (0, 1, 2). Pins and paths of the description are left out. */
export function blockModuli(spec: LatticeSpec, axis: number): BlockModuli {
  const model = linearModel(spec)
  const { dimensions, size, stiffness } = model
  const faces = Array.from({ length: dimensions }, (_, a) => facesOf(model, a))
  const pressed = faces[axis]
  if (!pressed) {
    throw refuse('impossible-value', {
      detail: `found axis ${axis}, expected 0 to ${dimensions - 1}.`,
      where: { field: 'axis' },
    })
  }
  const lengthM = faces.map(([low, high]) => high.atM - low.atM)
  if (!lengthM.every((length) => length > 0)) {
    throw refuse('impossible-value', {
      detail: `the nodes span ${lengthM.join(' by ')} m; expected a block with an extent along every axis.`,
      where: { field: 'lattice.nodes' },
    })
  }
  const held = pressed[0].nodes.map((node) => node * dimensions + axis)
  const moved = pressed[1].nodes.map((node) => node * dimensions + axis)
  const fixed = new Set([...held, ...moved])
  const free = Array.from({ length: size }, (_, i) => i).filter((i) => !fixed.has(i))
  const solver = factorise(part(stiffness, size, free, free), free.length)
  const right = free.map((row) => moved.reduce((sum, column) => sum - stiffness[row * size + column]!, 0))
  const solution = solver.solve(right)
  const motion = new Float64Array(size)
  for (const coordinate of moved) motion[coordinate] = 1
  for (const [i, coordinate] of free.entries()) motion[coordinate] = solution[i]!
  const stiffnessNpm = reaction(model, moved, motion)
  const faceSize = lengthM.reduce((product, length, a) => (a === axis ? product : product * length), 1)
  const axialStrain = 1 / lengthM[axis]!
  const lateral = faces.map(
    (pair, a) =>
      (meanMotion(model, pair[1], a, motion) - meanMotion(model, pair[0], a, motion)) / lengthM[a]!,
  )
  // Rollers leave the motions along the faces and the turn about the axis.
  const rigid = dimensions === 2 ? 1 : 3
  return {
    modulus: (stiffnessNpm * lengthM[axis]!) / faceSize,
    poisson: lateral.filter((_, a) => a !== axis).map((strain) => -strain / axialStrain + 0),
    stiffnessNpm,
    motion,
    mechanisms: free.length - solver.rank - rigid,
  }
}

/** The nodes at the least and at the greatest coordinate, to a millionth of the extent. */
function facesOf({ dimensions, size, positionsM }: LinearModel, axis: number): [Face, Face] {
  let low = Number.POSITIVE_INFINITY
  let high = Number.NEGATIVE_INFINITY
  for (let i = axis; i < size; i += dimensions) {
    low = Math.min(low, positionsM[i]!)
    high = Math.max(high, positionsM[i]!)
  }
  const near = (atM: number): Face => {
    const nodes: number[] = []
    for (let node = 0; node < size / dimensions; node++) {
      if (Math.abs(positionsM[node * dimensions + axis]! - atM) <= 1e-6 * (high - low)) nodes.push(node)
    }
    return { atM, nodes }
  }
  return [near(low), near(high)]
}

function meanMotion(
  { dimensions }: LinearModel,
  { nodes }: Face,
  axis: number,
  motion: Float64Array,
): number {
  return nodes.reduce((sum, node) => sum + motion[node * dimensions + axis]!, 0) / nodes.length
}

/** Sum of the elastic forces on the coordinates named. */
function reaction({ size, stiffness }: LinearModel, rows: readonly number[], motion: Float64Array): number {
  let sum = 0
  for (const row of rows) {
    for (let column = 0; column < size; column++) sum += stiffness[row * size + column]! * motion[column]!
  }
  return sum
}
