// Rigid motions of a set of nodes, translations and small turns, and how many of them some held coordinates allow.

import type { LinearModel } from './linear-model.js'
import { factorise } from './semidefinite.js'

/** Number of rigid motions that leave every coordinate that is not free where it is. */
export function countRigid({ dimensions, size, positionsM }: LinearModel, free: readonly number[]): number {
  const isFree = new Set(free)
  const held = Array.from({ length: size }, (_, i) => i).filter((i) => !isFree.has(i))
  const all = rigidMotions(dimensions, size, positionsM)
  return rankOf(all, free.concat(held)) - rankOf(all, held)
}

/** Translations along the axes, then turns (x to y; in space also y to z, x to z) about the centre of the nodes. */
export function rigidMotions(dimensions: number, size: number, positionsM: Float64Array): Float64Array[] {
  const nodes = size / dimensions
  const centre = new Float64Array(dimensions)
  for (let i = 0; i < size; i++) centre[i % dimensions]! += positionsM[i]! / nodes
  const translations = Array.from({ length: dimensions }, (_, axis) =>
    Float64Array.from({ length: size }, (_, i) => (i % dimensions === axis ? 1 : 0)),
  )
  const pairs = [
    [0, 1],
    [1, 2],
    [0, 2],
  ].slice(0, dimensions === 2 ? 1 : 3)
  const turns = pairs.map(([p, q]) =>
    Float64Array.from({ length: size }, (_, i) => {
      const first = i - (i % dimensions)
      if (i % dimensions === p) return -(positionsM[first + q!]! - centre[q!]!)
      return i % dimensions === q ? positionsM[first + p!]! - centre[p!]! : 0
    }),
  )
  return [...translations, ...turns]
}

function rankOf(columns: readonly Float64Array[], rows: readonly number[]): number {
  const gram = columns.flatMap((a) =>
    columns.map((b) => rows.reduce((sum, row) => sum + a[row]! * b[row]!, 0)),
  )
  return factorise(Float64Array.from(gram), columns.length).rank
}
