// What can go wrong in a simulated cluster (world.ts), and how strongly: nothing on a calm day, in a storm every fault
// at a strength drawn from the seed.

import { stream } from '../../shared/streams.js'
import { type FleetWeather, fleetOf } from './machines.js'

export interface Weather {
  readonly workers: number
  /** Chances in 1000, each per piece of work. */
  readonly dies: number
  readonly stalls: number
  readonly duplicates: number
  readonly late: number
  readonly handsBack: number
  /** Takes its whole process down once or more, never when it runs alone: no fault of the genome. */
  readonly deadly: number
  /** Delivered to two workers. */
  readonly twice: number
  /** Answered under the number of another try. */
  readonly misnumbered: number
  /** A result held back by up to 1000 times its duration. */
  readonly delayed: number
  /** Chances in 1000 per append. */
  readonly crashes: number
  /** Chances in 1000 per look: stopped by a signal and started again; replaced while it still believes to be the one. */
  readonly stopped: number
  readonly replaced: number
  /** The search is told to rest after so many simulations, then after the next number, then to finish. */
  readonly rests: readonly number[]
  /** Workers that give wrong results, and their chance in 1000. */
  readonly liars: number
  readonly lies: number
  /** Genomes of this size kill whoever simulates them; 0 for none. */
  readonly poisonSize: number
  /** Machines that come and go, and are told to the coordinator; without, `workers` of nobody knows which machines. */
  readonly fleet?: FleetWeather
  /** Chances in 1000 per look: the queue is emptied, and with it everything under way and every answer. */
  readonly emptied: number
  /** The coordinator stands still for two minutes while answers pile up. */
  readonly frozen: number
  /** Old work is done once more. */
  readonly redelivered: number
  /** An answer for an evaluation that is nobody's. */
  readonly foreign: number
  /** Individuals sent between islands are delivered again. */
  readonly mailTwice: number
}

export const calm: Weather = {
  workers: 3,
  dies: 0,
  stalls: 0,
  duplicates: 0,
  late: 0,
  handsBack: 0,
  delayed: 0,
  deadly: 0,
  twice: 0,
  misnumbered: 0,
  crashes: 0,
  stopped: 0,
  replaced: 0,
  rests: [],
  liars: 0,
  lies: 0,
  poisonSize: 0,
  emptied: 0,
  frozen: 0,
  redelivered: 0,
  foreign: 0,
  mailTwice: 0,
}

/** Bad weather drawn from the seed: every fault at its own strength, many of them none. */
export function stormOf(seed: number): Weather {
  const draw = stream(seed, 'weather', 1)
  const some = (most: number) => (draw.chance(1, 2) ? 0 : 1 + draw.below(most))
  return {
    workers: 1 + draw.below(24),
    dies: some(80),
    stalls: some(60),
    duplicates: some(300),
    late: some(100),
    handsBack: some(100),
    delayed: some(200),
    deadly: some(60),
    twice: some(100),
    misnumbered: some(100),
    crashes: some(20),
    stopped: some(4),
    replaced: some(4),
    rests: [],
    liars: 0,
    lies: 0,
    poisonSize: 0,
    emptied: some(5),
    frozen: some(5),
    redelivered: some(30),
    foreign: some(30),
    mailTwice: some(30),
    ...(draw.chance(1, 2) ? { fleet: fleetOf(draw) } : {}),
  }
}
