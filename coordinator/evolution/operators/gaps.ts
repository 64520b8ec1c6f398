// Which genes an operator touches when each is touched independently with the same chance p: the number of
// untouched genes before the next touched one is geometric, so genes that stay as they are cost nothing.

import { log, log1p } from '../../../shared/detmath/index.js'
import type { Stream } from '../../../shared/streams.js'

/**
 * Draws the number of untouched genes before the next touched one: P(gap >= k) = (1 - p)^k, by inversion
 * (Devroye, Non-uniform random variate generation, 1986, chapter X.2). Every probability is right to about 2^-52,
 * the step of a 53-bit uniform number. p = 0: Infinity; p = 1: 0.
 */
export function gapsOf(rate: number): (stream: Stream) => number {
  if (rate >= 1) return () => 0
  if (rate <= 0) return () => Number.POSITIVE_INFINITY
  const logKept = log1p(-rate)
  return (stream) => Math.floor(log(1 - stream.uniform()) / logKept)
}
