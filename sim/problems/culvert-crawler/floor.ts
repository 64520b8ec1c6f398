// The culvert's floor and everything else that is drawn for one simulation. The body starts with its front at
// x = 0; the floor is smooth behind and strewn with debris in front, so that bodies of every length meet the same.

import type { Stream } from '../../../shared/streams.js'
import type { GroundSpec } from '../../lattice/spec.js'
import type { Surroundings, World } from './trial.js'

export interface Lump {
  readonly centreM: number
  readonly halfWidthM: number
  readonly heightM: number
}

export interface CulvertCondition extends Surroundings {
  readonly debris: readonly Lump[]
}

const spacingM = 0.004
export const firstXM = -0.8
export const lastXM = 2.4

/** Friction 0.4 to 0.9, lag 20 to 80 ms, stones and silt 2 to 8 mm high every 6 to 20 cm. */
export function drawCulvert(stream: Stream): CulvertCondition {
  const between = (low: number, high: number) => low + stream.uniform() * (high - low)
  const floorFriction = between(0.4, 0.9)
  const lagSeconds = between(0.02, 0.08)
  const debris: Lump[] = []
  let centreM = between(0.04, 0.12)
  while (centreM < lastXM - 0.1) {
    const heightM = between(0.002, 0.008)
    debris.push({ centreM, halfWidthM: heightM * between(2.5, 5), heightM })
    centreM += between(0.06, 0.2)
  }
  return { floorFriction, lagSeconds, debris }
}

/** A slope that no debris exceeds: 1.54 / 2.5, rounded up. For the choice of the step. */
export const slopeMost = 0.62

export const culvert: World<CulvertCondition> = {
  groundOf: ({ debris }) => culvertGround(debris),
  steepest: { firstXM: 0, spacingM: 1, heightsM: [0, slopeMost] },
  slopeMost,
}

/** Heights on a grid of 4 mm; a lump is h (1 - u^2)^2, smooth at its foot, steepest 1.54 h / half width. */
export function culvertGround(debris: readonly Lump[]): GroundSpec {
  const heightsM = new Float64Array(Math.round((lastXM - firstXM) / spacingM) + 1)
  for (const { centreM, halfWidthM, heightM } of debris) {
    const first = Math.max(0, Math.ceil((centreM - halfWidthM - firstXM) / spacingM))
    const last = Math.min(heightsM.length - 1, Math.floor((centreM + halfWidthM - firstXM) / spacingM))
    for (let i = first; i <= last; i++) {
      const u = (firstXM + i * spacingM - centreM) / halfWidthM
      const bump = heightM * (1 - u * u) * (1 - u * u)
      heightsM[i] = Math.max(heightsM[i]!, bump)
    }
  }
  return { firstXM, spacingM, heightsM }
}
