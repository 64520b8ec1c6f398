// Which stream everything random about a simulation is drawn from.

import { islandOf, numberOf } from './ids.js'
import { type Purpose, type Stream, stream } from './streams.js'

/**
 * The stream of condition `replicate` (0, 1, ...) of an individual. Shared: rivals face the same conditions
 * and differences between them are their own (common random numbers). Otherwise the individual's own.
 */
export function conditionStream(
  seed: number,
  shared: boolean,
  individual: number,
  replicate: number,
  purpose: Purpose = 'condition',
): Stream {
  return shared
    ? stream(seed, purpose, 0, 0, replicate)
    : stream(seed, purpose, islandOf(individual), numberOf(individual), replicate)
}
