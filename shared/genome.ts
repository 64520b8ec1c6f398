// The shape of a genome, as data: named parts, each with an encoding. Types only; what can be done with an
// encoding (bounds, bytes, random members) lives in encodings.ts, variation in coordinator/evolution.
//
// Value of a part, by encoding:
//   real     Float64Array(length), each in [low, high]; scale 'log' means variation works on the logarithm
//   integer  Int32Array(length), each in [low, high]
//   choice   Int32Array(length), each the index of one of `options`
//   bits     Uint8Array(length) of 0 and 1
//   layout   Int32Array(product of size), slot values as in choice, slots on a regular lattice in row-major
//            order (last axis fastest); the problem may repair it

export interface RealEncoding {
  readonly kind: 'real'
  readonly length: number
  readonly low: number
  readonly high: number
  readonly scale: 'linear' | 'log'
  readonly unit?: string
}
export interface IntegerEncoding {
  readonly kind: 'integer'
  readonly length: number
  readonly low: number
  readonly high: number
  readonly unit?: string
}
export interface ChoiceEncoding {
  readonly kind: 'choice'
  readonly length: number
  readonly options: readonly string[]
}
export interface BitsEncoding {
  readonly kind: 'bits'
  readonly length: number
}
export interface LayoutEncoding {
  readonly kind: 'layout'
  /** Slots along each axis of the lattice, 1 to 3 axes. */
  readonly size: readonly number[]
  readonly options: readonly string[]
}
export type Encoding = RealEncoding | IntegerEncoding | ChoiceEncoding | BitsEncoding | LayoutEncoding

/** Parts in the order of declaration; the order is part of the search's definition. */
export type GenomeSpec = { readonly [part: string]: Encoding }

export type PartValue = Float64Array | Int32Array | Uint8Array
export type ValueOf<E extends Encoding> = E extends RealEncoding
  ? Float64Array
  : E extends BitsEncoding
    ? Uint8Array
    : Int32Array
export type GenomeOf<S extends GenomeSpec> = { readonly [P in keyof S]: ValueOf<S[P]> }
/** A genome whose specification is known only at run time. Never changed in place once it has left its maker. */
export type Genome = { readonly [part: string]: PartValue }
