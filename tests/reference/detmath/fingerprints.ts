// The bits of every function of detmath at 20,000 points, as one hash each. Only shared code is used, so that
// the same file can run under any host.

import { detMath } from '../../../shared/detmath/index.js'
import { powerOfTwo } from '../../../shared/detmath/words.js'
import { hex, sha256 } from '../../../shared/digests.js'
import { type Stream, stream } from '../../../shared/streams.js'

const points = 20_000
const hostFunctions = [
  'abs',
  'ceil',
  'clz32',
  'floor',
  'fround',
  'imul',
  'max',
  'min',
  'round',
  'sign',
  'sqrt',
  'trunc',
]

/** In turn: any double, a number of everyday size, a small one, one between -1 and 1, one just above 1. */
const kinds: readonly ((s: Stream) => number)[] = [
  (s) => (1 + s.uniform()) * powerOfTwo(s.below(2046) - 1022),
  (s) => s.uniform() * 700,
  (s) => s.uniform() * 10,
  (s) => s.uniform(),
  (s) => 1 + s.uniform() * powerOfTwo(-s.below(50)),
]

function drawPoint(s: Stream, i: number): number {
  const size = kinds[i % kinds.length]!(s)
  return s.chance(1, 3) ? -size : size
}

/** Function name to the first 16 hexadecimal digits of SHA-256 over its results, 8 little-endian bytes each. */
export function fingerprints(): { [name: string]: string } {
  const found: { [name: string]: string } = {}
  const functions = detMath as unknown as { readonly [name: string]: unknown }
  for (const name of Object.keys(detMath)) {
    const f = functions[name]
    if (typeof f !== 'function' || name === 'random' || hostFunctions.includes(name)) continue
    const s = stream(20_261_201, 'spare', 3)
    const view = new DataView(new ArrayBuffer(8 * points))
    for (let i = 0; i < points; i++) {
      const y = (f as (...x: number[]) => number)(drawPoint(s, i), drawPoint(s, i + Math.floor(i / 5)))
      // A NaN has many bit patterns; it counts as one.
      if (Number.isNaN(y)) view.setUint32(8 * i, 0xffffffff)
      else view.setFloat64(8 * i, y, true)
    }
    found[name] = hex(sha256(new Uint8Array(view.buffer))).slice(0, 16)
  }
  return found
}
