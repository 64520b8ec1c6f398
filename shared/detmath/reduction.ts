// Reduction of an angle to [-pi/4, pi/4]: x = n pi/2 + r, with r as a sum of two doubles and n modulo 4.
// Ported from fdlibm (e_rem_pio2.c; Sun Microsystems 1993, see NOTICE.txt).

import { highWord } from './words.js'

/** What the last reduceByHalfPi left: r = reduced[0] + reduced[1]. */
export const reduced = new Float64Array(2)

function exponentOf(x: number): number {
  return (highWord(x) >> 20) & 0x7ff
}

/**
 * Leaves x - n pi/2 in `reduced` and returns n modulo 4. x is finite. pi/2 is taken away in parts of 33 bits,
 * as many as cancellation asks for; huge arguments go to reduceHuge.
 */
export function reduceByHalfPi(x: number): number {
  const n = Math.round(x * 0.6366197723675814)
  let r = x - n * 1.5707963267341256
  let w = n * 6.077100506506192e-11
  let y = r - w
  const exponent = exponentOf(x)
  if (exponent - exponentOf(y) > 16) {
    let t = r
    w = n * 6.077100506303966e-11
    r = t - w
    w = n * 2.0222662487959506e-21 - (t - r - w)
    y = r - w
    if (exponent - exponentOf(y) > 49) {
      t = r
      w = n * 2.0222662487111665e-21
      r = t - w
      w = n * 8.4784276603689e-32 - (t - r - w)
      y = r - w
    }
  }
  reduced[0] = y
  reduced[1] = r - y - w
  return n & 3
}
