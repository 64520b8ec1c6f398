// What is evolved: the layout of the joints, where the base pin stands, the lengths of the links, the comb, and the
// drive table: six poses a joint that one working cycle goes through and back to the first.
//
//   two-arm      base pin, arm, elbow, forearm with the comb                         2 motors
//   three-arm    the same with a driven wrist between forearm and comb               3 motors
//   sliding-arm  base pin, arm, a rod that slides out of it with the comb            2 motors
//   crank        four-bar linkage: a crank turns once a cycle, the comb sits on its coupler, a rocker guides it   1 motor
//
// Poses are shares of a joint's range. Genes that a layout does not use wait for a change of layout.

import { choice, real } from '../../../shared/encodings.js'
import type { GenomeOf } from '../../../shared/genome.js'
import { numbers } from './numbers.js'

export const layouts = ['two-arm', 'three-arm', 'sliding-arm', 'crank'] as const
export type Layout = (typeof layouts)[number]
export const posesPerJoint = 6
export const jointsMost = 3

export const rakeGenome = {
  layout: choice({ length: 1, options: layouts }),
  baseX: real({ low: numbers.baseLowM[0], high: numbers.baseHighM[0], unit: 'm' }),
  baseY: real({ low: numbers.baseLowM[1], high: numbers.baseHighM[1], unit: 'm' }),
  links: real({ length: 2, low: 0.3, high: 1.3, unit: 'm' }),
  poses: real({ length: jointsMost * posesPerJoint, low: 0, high: 1, unit: 'share' }),
  period: real({ low: 4, high: 12, scale: 'log', unit: 's' }),
  gear: choice({ length: jointsMost, options: ['1:1', '1:2', '1:4'] }),
  combAngle: real({ low: -180, high: 180, unit: 'degree' }),
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

/**
 * Share of its range that joint i is told at this time of the cycle: from pose to pose along 3 u^2 - 2 u^3, which
 * starts and stops without a jerk of speed.
 */
export function poseShare(genome: RakeGenome, joint: number, seconds: number): number {
  const place = (seconds / genome.period[0]!) * posesPerJoint
  const from = Math.floor(place)
  const u = place - from
  const pose = (k: number) => genome.poses[joint * posesPerJoint + (k % posesPerJoint)]!
  return pose(from) + (pose(from + 1) - pose(from)) * u * u * (3 - 2 * u)
}
