// The ground as a lattice holds it: its height anywhere.

import type { Lattice } from './layout.js'

/** Height of the ground under x (and z, 3-D), m; -Infinity where there is none. Level beyond the ends. */
export function groundHeightM(lattice: Lattice, xM: number, zM = 0): number {
  const { heightsM, terrain, groundColumns, groundRows } = lattice
  if (terrain[2] === Number.NEGATIVE_INFINITY) return Number.NEGATIVE_INFINITY
  const along = Math.min(Math.max((xM - terrain[0]!) * terrain[1]!, 0), groundColumns - 1)
  const column = Math.min(Math.floor(along), groundColumns - 2)
  const u = along - column
  const near = heightAt(heightsM, column, u)
  if (groundRows === 1) return near
  const across = Math.min(Math.max((zM - terrain[3]!) * terrain[4]!, 0), groundRows - 1)
  const row = Math.min(Math.floor(across), groundRows - 2)
  const first = heightAt(heightsM, row * groundColumns + column, u)
  const second = heightAt(heightsM, (row + 1) * groundColumns + column, u)
  return first + (second - first) * (across - row)
}

function heightAt(heightsM: Float64Array, at: number, u: number): number {
  return heightsM[at]! + (heightsM[at + 1]! - heightsM[at]!) * u
}
