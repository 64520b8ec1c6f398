// The bottom of a pipe with debris, and everything else that is drawn for one simulation. The body starts with its front
// at x = 0; the pipe is clean behind and strewn with debris in front.

import type { Stream } from '../../../shared/streams.js'
import type { GroundSpec } from '../../lattice/spec.js'
import { firstXM, lastXM } from '../culvert-crawler/floor.js'
import { numbers } from '../culvert-crawler/numbers.js'
import type { Surroundings, World } from '../culvert-crawler/trial.js'

export interface RoundLump {
  readonly centreXM: number
  readonly centreZM: number
  readonly radiusM: number
  readonly heightM: number
}

export interface PipeCondition extends Surroundings {
  readonly debris: readonly RoundLump[]
}

const spacingM = 0.008
/** Half of the breadth that is laid out; the walls go on level beyond, out of reach. */
export const halfBreadthM = 0.08

/** The pipe's own height, m: the parabola that touches its circle at the bottom. */
export function invertM(zM: number): number {
  return (zM * zM) / numbers.boreM
}

/** Friction 0.4 to 0.9, lag 20 to 80 ms, stones and silt 3 to 8 mm high every 2 to 7 cm, left and right. */
export function drawPipe(stream: Stream): PipeCondition {
  const between = (low: number, high: number) => low + stream.uniform() * (high - low)
  const floorFriction = between(0.4, 0.9)
  const lagSeconds = between(0.02, 0.08)
  const debris: RoundLump[] = []
  let centreXM = between(0.04, 0.12)
  while (centreXM < lastXM - 0.1) {
    const heightM = between(0.003, 0.008)
    const radiusM = heightM * between(2.5, 5)
    debris.push({ centreXM, centreZM: between(-0.05, 0.05), radiusM, heightM })
    centreXM += between(0.02, 0.07)
  }
  return { floorFriction, lagSeconds, debris }
}

/** Heights on a grid of 8 mm; a lump is h (1 - r^2)^2 on top of the pipe, smooth at its foot, steepest 1.54 h / radius. */
export function pipeGround(debris: readonly RoundLump[]): GroundSpec & { readonly rows: number } {
  const columns = Math.round((lastXM - firstXM) / spacingM) + 1
  const rows = Math.round((2 * halfBreadthM) / spacingM) + 1
  const lumps = new Float64Array(columns * rows)
  for (const { centreXM, centreZM, radiusM, heightM } of debris) {
    const within = (centre: number, first: number, count: number) => [
      Math.max(0, Math.ceil((centre - radiusM - first) / spacingM)),
      Math.min(count - 1, Math.floor((centre + radiusM - first) / spacingM)),
    ]
    const [west, east] = within(centreXM, firstXM, columns) as [number, number]
    const [south, north] = within(centreZM, -halfBreadthM, rows) as [number, number]
    for (let row = south; row <= north; row++) {
      for (let column = west; column <= east; column++) {
        const u = (firstXM + column * spacingM - centreXM) / radiusM
        const w = (-halfBreadthM + row * spacingM - centreZM) / radiusM
        const left = 1 - u * u - w * w
        const at = row * columns + column
        if (left > 0) lumps[at] = Math.max(lumps[at]!, heightM * left * left)
      }
    }
  }
  for (let row = 0; row < rows; row++) {
    const pipe = invertM(-halfBreadthM + row * spacingM)
    for (let column = 0; column < columns; column++) lumps[row * columns + column]! += pipe
  }
  return { firstXM, spacingM, heightsM: lumps, rows, firstZM: -halfBreadthM, spacingZM: spacingM }
}

/** Debris alone along x, 1.54 / 2.5; debris on the steepest pipe across, 2 z / bore more. Rounded up. */
const slopes = { along: 0.62, across: 0.62 + (2 * halfBreadthM) / numbers.boreM }
export const slopeMost = Math.sqrt(slopes.along * slopes.along + slopes.across * slopes.across)

export const pipe: World<PipeCondition> = {
  groundOf: ({ debris }) => pipeGround(debris),
  steepest: { firstXM: 0, spacingM: 1, heightsM: [0, slopeMost] },
  slopeMost,
}
