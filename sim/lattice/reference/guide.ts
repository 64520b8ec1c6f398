// What guided struts feel and want: sensors, then the commanded strain of every guided strut. Once a step, first of all.

import type { Lattice } from '../layout.js'

/** Raw values, then s += (raw - s) * rate. */
function sense(lattice: Lattice): void {
  const { sensorCount, sensorKind, sensorAt, sensorRate, sensed, touching } = lattice
  for (let n = 0; n < sensorCount; n++) {
    const at = sensorAt[n]!
    const raw = sensorKind[n] === 0 ? touching[at]! : strainOf(lattice, at)
    sensed[n]! += (raw - sensed[n]!) * sensorRate[n]!
  }
}

/** (length - rest) / rest. */
function strainOf({ dimensions, ends, restM, nodes }: Lattice, strut: number): number {
  const a = ends[2 * strut]!
  const b = ends[2 * strut + 1]!
  const dx = nodes[b]! - nodes[a]!
  const dy = nodes[b + 1]! - nodes[a + 1]!
  let q = dx * dx + dy * dy
  if (dimensions === 3) {
    const dz = nodes[b + 2]! - nodes[a + 2]!
    q += dz * dz
  }
  return (Math.sqrt(q) - restM[strut]!) / restM[strut]!
}

/**
 * target = host + driven sine * strainCos + driven cosine * strainSin + sum of gain * sensor, kept within +-stroke;
 * e += min(rate h, max(-rate h, target - e)).
 */
export function guide(lattice: Lattice): void {
  const { activeCount, guidedCount, group, strainCos, strainSin, driven, hostStrain, guidedStrain } = lattice
  const { feedbackFirst, feedbackSensor, feedbackGain, sensed, strokeMost, strainStepMost } = lattice
  sense(lattice)
  for (let j = 0; j < guidedCount; j++) {
    const g = group[activeCount + j]!
    let target =
      hostStrain[j]! + driven[g]! * strainCos[activeCount + j]! + driven[g + 1]! * strainSin[activeCount + j]!
    for (let row = feedbackFirst[j]!; row < feedbackFirst[j + 1]!; row++) {
      target += feedbackGain[row]! * sensed[feedbackSensor[row]!]!
    }
    const stroke = strokeMost[j]!
    const wanted = Math.min(stroke, Math.max(-stroke, target)) - guidedStrain[j]!
    const most = strainStepMost[j]!
    guidedStrain[j]! += Math.min(most, Math.max(-most, wanted))
  }
}
