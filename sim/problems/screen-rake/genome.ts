// What is evolved: the layout of the joints, where the base pin stands, the lengths of the links, the comb, and the way
// that the comb is led: a closed path, its middle and the first two harmonics of one working cycle. The drives are told
// the joint places that put the comb there, so that a machine of any lengths is put together and knows its work.
//
//   two-arm      base pin, arm, elbow, forearm with the comb                         2 motors
//   three-arm    the same with a driven wrist that holds the comb at an angle        3 motors
//   sliding-arm  base pin, arm, a rod that slides out of it with the comb            2 motors
//   crank        four-bar linkage: a crank turns once a cycle, the comb sits on its coupler, a rocker guides it; its
//                lengths are its path                                                1 motor
//
// Genes that a layout does not use wait for a change of layout.

import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import { choice, real } from '../../../shared/encodings.js'
import type { GenomeOf } from '../../../shared/genome.js'
import { numbers } from './numbers.js'

export const layouts = ['two-arm', 'three-arm', 'sliding-arm', 'crank'] as const
export type Layout = (typeof layouts)[number]
export const jointsMost = 3

export const rakeGenome = {
  layout: choice({ length: 1, options: layouts }),
  baseX: real({ low: numbers.baseLowM[0], high: numbers.baseHighM[0], unit: 'm' }),
  baseY: real({ low: numbers.baseLowM[1], high: numbers.baseHighM[1], unit: 'm' }),
  links: real({ length: 2, low: 0.4, high: 1.3, unit: 'm' }),
  /** Middle of the path: up along the screen from its foot, and off it into the water. */
  pathAlong: real({ low: 0.2, high: 1.2, unit: 'm' }),
  pathOff: real({ low: 0, high: 0.5, unit: 'm' }),
  /** Cosine and sine of the first harmonic, then of the second. */
  swingAlong: real({ length: 4, low: -0.6, high: 0.6, unit: 'm' }),
  swingOff: real({ length: 4, low: -0.3, high: 0.3, unit: 'm' }),
  /** Direction of a comb with a wrist, from straight along x, and the first harmonic of it. */
  tilt: real({ low: -120, high: 60, unit: 'degree' }),
  tiltSwing: real({ length: 2, low: -60, high: 60, unit: 'degree' }),
  period: real({ low: 3, high: 6, scale: 'log', unit: 's' }),
  gear: choice({ length: jointsMost, options: ['1:1', '1:2', '1:4'] }),
  combAngle: real({ low: -90, high: 90, unit: 'degree' }),
  tine: real({ low: 0.05, high: 0.25, unit: 'm' }),
  hook: real({ low: 0, high: 0.15, unit: 'm' }),
  hookAngle: real({ low: -90, high: 90, unit: 'degree' }),
  crank: real({ low: 0.1, high: 0.5, unit: 'm' }),
  rocker: real({ low: 0.3, high: 1, unit: 'm' }),
  rockerPin: real({ low: 0.2, high: 0.9, unit: 'm' }),
  rockerPinAngle: real({ low: -180, high: 180, unit: 'degree' }),
} as const

export type RakeGenome = GenomeOf<typeof rakeGenome>

export function layoutOf(genome: RakeGenome): Layout {
  return layouts[genome.layout[0]!]!
}

/** Ratio of the chain stage of motor i. */
export function ratioOf(genome: RakeGenome, i: number): number {
  return numbers.gears[genome.gear[i]!]!
}

/** Value of a middle and up to two harmonics (cosine and sine each) in this part of the cycle (in turns). */
function harmonics(middle: number, swing: Float64Array, turns: number): number {
  const angle = 2 * Math.PI * (turns - Math.floor(turns))
  const [c, s] = [cos(angle), sin(angle)]
  const first = swing[0]! * c + swing[1]! * s
  return middle + first + (swing[2] ?? 0) * (c * c - s * s) + (swing[3] ?? 0) * 2 * s * c
}

const [screenX, screenY] = [cos(numbers.screenAngle), sin(numbers.screenAngle)]

/** Where the comb shall be in this part of the cycle. */
export function pathAt(genome: RakeGenome, turns: number): readonly [x: number, y: number] {
  const along = harmonics(genome.pathAlong[0]!, genome.swingAlong, turns)
  const off = harmonics(genome.pathOff[0]!, genome.swingOff, turns)
  return [along * screenX - off * screenY, along * screenY + off * screenX]
}

/** Where a comb with a wrist shall point, degrees from straight along x. */
export function tiltAt({ tilt, tiltSwing }: RakeGenome, turns: number): number {
  return harmonics(tilt[0]!, tiltSwing, turns)
}
