// Effective modulus and Poisson's ratio of a finite block of a lattice, as a testing machine finds them: one face on
// rollers, the opposite one moved along its normal on rollers, everything else free; small displacements.
//   E = (force / face) / (displacement / length),   nu = -(mean lateral strain) / (axial strain)
// Length, faces and lateral strains are those of the nodes' bounding box, the lateral strain between the mean motions
// of the nodes on its opposite faces. Source: common practice of material testing.

import { refuse } from '../../shared/refusals.js'
import type { LatticeSpec } from '../lattice/spec.js'
import { type LinearModel, linearModel, part } from './linear-model.js'
import { countRigid, rigidMotions } from './rigid-motions.js'
import { type Factorisation, factorise } from './semidefinite.js'

export interface BlockModuli {
  /** N/m in 2-D (unit thickness), Pa in 3-D. */
  readonly modulus: number
  /** Towards the other axes in order; undefined where a mechanism leaves the lateral strain to chance. */
  readonly poisson: readonly (number | undefined)[]
  /** Force for a unit displacement of the face, N/m. */
  readonly stiffnessNpm: number
  /** Motion of every coordinate for a unit displacement of the face, one of those that floating parts allow. */
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
  const lateral = faces.map((pair, a) => {
    if (a === axis) return undefined
    const extension = lateralExtension(model, pair, a, axis)
    return determined(solver, free, extension) ? applied(extension, motion) / lengthM[a]! : undefined
  })
  return {
    modulus: (stiffnessNpm * lengthM[axis]!) / faceSize,
    poisson: lateral
      .filter((_, a) => a !== axis)
      .map((strain) => (strain === undefined ? undefined : -strain * lengthM[axis]! + 0)),
    stiffnessNpm,
    motion,
    mechanisms: free.length - solver.rank - countRigid(model, free),
  }
}

/**
 * What a motion of all coordinates is multiplied with to give the mean motion of one face less that of the opposite one;
 * with its part along a turn about the pulled axis taken out, which is no strain and which nothing holds.
 */
function lateralExtension(
  model: LinearModel,
  pair: readonly [Face, Face],
  a: number,
  axis: number,
): Float64Array {
  const { dimensions, size, positionsM } = model
  const weights = new Float64Array(size)
  for (const [face, sign] of [
    [pair[0], -1],
    [pair[1], 1],
  ] as const) {
    for (const node of face.nodes) weights[node * dimensions + a]! += sign / face.nodes.length
  }
  if (dimensions === 2) return weights
  // Turns x to y, y to z, x to z are those about z, x and y.
  const turn = rigidMotions(dimensions, size, positionsM)[dimensions + [1, 2, 0][axis]!]!
  const share = applied(weights, turn) / applied(turn, turn)
  return weights.map((weight, i) => weight - share * turn[i]!)
}

/** Whether no motion that costs nothing changes what `weights` measure: whether they lie in the range of the stiffness. */
function determined(solver: Factorisation, free: readonly number[], weights: Float64Array): boolean {
  const right = free.map((coordinate) => weights[coordinate]!)
  return solver.residual(solver.solve(right), right) < 1e-7
}

function applied(weights: Float64Array, motion: Float64Array): number {
  let sum = 0
  for (let i = 0; i < weights.length; i++) sum += weights[i]! * motion[i]!
  return sum
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

/** Sum of the elastic forces on the coordinates named. */
function reaction({ size, stiffness }: LinearModel, rows: readonly number[], motion: Float64Array): number {
  let sum = 0
  for (const row of rows) {
    for (let column = 0; column < size; column++) sum += stiffness[row * size + column]! * motion[column]!
  }
  return sum
}
