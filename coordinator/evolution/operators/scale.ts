// The axis on which a real part varies: its values themselves, or their logarithms for `scale: log`.

import { exp, log } from '../../../shared/detmath/index.js'
import type { RealEncoding } from '../../../shared/genome.js'

export interface Axis {
  readonly low: number
  readonly high: number
  /** From a value to its place on the axis, low to high. */
  readonly to: (value: number) => number
  /** From a place back to a value within the bounds. Rounding leaves neither, whichever way it goes. */
  readonly from: (place: number) => number
}

export function axisOf(encoding: RealEncoding): Axis {
  const { low, high } = encoding
  if (encoding.scale === 'linear')
    return { low, high, to: (value) => value, from: (place) => clamp(place, low, high) }
  const logLow = log(low)
  const logHigh = log(high)
  return {
    low: logLow,
    high: logHigh,
    to: (value) => clamp(log(value), logLow, logHigh),
    from: (place) => clamp(exp(place), low, high),
  }
}

function clamp(x: number, low: number, high: number): number {
  return Math.min(high, Math.max(low, x))
}
