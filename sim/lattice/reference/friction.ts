// Which coefficient of friction holds, by the direction in which a node slides: the one law of it, for the integration
// and for whoever accounts for its losses.

import { tiny } from '../layout.js'

/** In the plane; `sliding` has the sign of the speed along the ground, towards +x positive. */
export function coefficientPlane(i: number, sliding: number, friction: Float64Array): number {
  return sliding > 0 ? friction[2 * i]! : friction[2 * i + 1]!
}

/**
 * In space, sliding along (tx, tz) as seen from above: along an ellipse between the coefficients forward or backward (mu_f)
 * and sideways (mu_s) of the node's heading, c the cosine of the angle between sliding and heading (a foot that goes up
 * a slope straight ahead does not slide sideways): sqrt((mu_f c)^2 + mu_s^2 (1 - c^2)). Where all three are equal it is
 * that number itself: friction does not depend on direction, to the bit. The heading is taken from the other node's
 * place as it is: during a step, a node with a smaller number has moved already.
 */
export function coefficientSpace(
  i: number,
  tx: number,
  tz: number,
  friction: Float64Array,
  heading: Int32Array,
  nodes: Float64Array,
): number {
  const o = i * 9
  const forward = friction[3 * i]!
  const backward = friction[3 * i + 1]!
  const sideways = friction[3 * i + 2]!
  if (forward === backward && forward === sideways) return forward
  let hx = 1
  let hz = 0
  const ahead = heading[i]!
  if (ahead >= 0) {
    const dx = nodes[ahead]! - nodes[o]!
    const dz = nodes[ahead + 2]! - nodes[o + 2]!
    const distance = Math.sqrt(dx * dx + dz * dz) + tiny
    hx = dx / distance
    hz = dz / distance
  }
  const c = (tx * hx + tz * hz) / (Math.sqrt(tx * tx + tz * tz) + tiny)
  const muF = c > 0 ? forward : backward
  return Math.sqrt(muF * c * (muF * c) + sideways * sideways * Math.max(0, 1 - c * c))
}
