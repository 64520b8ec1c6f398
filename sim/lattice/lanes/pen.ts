// Writing into the kernel's memory: a pen knows the memory, the variant and the lattice of every lane.

import type { Lattice } from '../layout.js'
import type { Engine } from './engine.js'
import { numbersAt } from './header.js'
import type { Places, Sizes, Variant } from './layout.js'

/** Names of the lattice's arrays of numbers. */
export type NumberField = {
  [Name in keyof Lattice]: Lattice[Name] extends Float64Array ? Name : never
}[keyof Lattice]

export interface Pen {
  readonly engine: Engine
  readonly variant: Variant
  readonly sizes: Sizes
  readonly places: Places
  /** One for every lane of the module; those beyond the given ones repeat the first. */
  readonly lanes: readonly Lattice[]
}

/** One value for each lane at byte `at`. */
export function putWide(
  { engine, variant, lanes }: Pen,
  at: number,
  field: NumberField,
  index: number,
): void {
  const first = at / variant.numberBytes
  for (let lane = 0; lane < lanes.length; lane++) engine.numbers[first + lane] = lanes[lane]![field][index]!
}

/** Values index, index + 1, ... of a field, one after the other. */
export function putWideRow(pen: Pen, at: number, field: NumberField, index: number, count: number): void {
  for (let i = 0; i < count; i++) putWide(pen, at + i * pen.variant.wide, field, index + i)
}

/** The same number in all lanes. */
export function putEqual({ engine, variant, lanes }: Pen, at: number, value: number): void {
  const first = at / variant.numberBytes
  engine.numbers.fill(value, first, first + lanes.length)
}

/** A material value: once, or one for each lane. */
export function putMaterial(pen: Pen, at: number, field: NumberField, index: number): void {
  if (pen.variant.own) putWide(pen, at, field, index)
  else pen.engine.numbers[at / pen.variant.numberBytes] = pen.lanes[0]![field][index]!
}

export function putWord({ engine }: Pen, at: number, value: number): void {
  engine.words[at >> 2] = value
}

/** Byte of number n of the head. */
export function numberPlace({ wide }: Variant, n: number): number {
  return numbersAt + n * wide
}

/** Address of the record of a node that the lattice names by its offset. */
export function nodeAt({ places, sizes, lanes }: Pen, offset: number): number {
  return places.nodes.first + (offset / lanes[0]!.stride) * sizes.node
}
