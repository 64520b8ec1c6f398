// Runs one method alone, as an island does: a window of proposals, committed in order. For reference tests, which
// want exact counts and speed and none of the rest of a search.

import { defaultSettings } from '../../coordinator/evolution/settings.js'
import type {
  Birth,
  Individual,
  Method,
  MethodContext,
  MethodMachine,
  Settings,
  Variation,
} from '../../coordinator/evolution/types.js'
import type { Genome } from '../../shared/genome.js'
import { idOf } from '../../shared/ids.js'
import { type Stream, stream } from '../../shared/streams.js'

export interface DriveOptions {
  readonly method: Method
  readonly population: number
  readonly variation: Variation
  /** Scores to minimise. */
  readonly score: (genome: Genome) => readonly number[]
  readonly seed: number
  readonly settings?: Settings
  readonly objectives?: number
  /** Evaluations outstanding at most; 1 unless a test is about more. */
  readonly lookahead?: number
}

export interface Drive {
  readonly machine: MethodMachine
  /** Proposes up to the lookahead, commits the oldest outstanding and returns it. */
  readonly step: () => Individual
  /** Commits `count` more and returns the last. */
  readonly steps: (count: number) => Individual
}

export function contextOf(options: Omit<DriveOptions, 'score' | 'seed'>): MethodContext {
  return {
    spec: {},
    objectives: options.objectives ?? 1,
    population: options.population,
    settings: { ...defaultSettings(options.method.settings), ...options.settings },
    variation: options.variation,
  }
}

export function individualOf(
  island: number,
  number: number,
  birth: Birth,
  score: readonly number[],
): Individual {
  return {
    id: idOf(island, number),
    genome: birth.genome,
    parents: birth.parents,
    origin: birth.origin,
    bornAtCommit: 0,
    blocks: [],
    values: new Float64Array(0),
    replicates: 1,
    failedSimulations: 0,
    score: Float64Array.from(score),
    age: birth.age,
  }
}

const island = 1

export function drive(options: DriveOptions): Drive {
  const machine = options.method.create(contextOf(options))
  const lookahead = options.lookahead ?? 1
  const outstanding: Individual[] = []
  let births = 0
  let commits = 0
  const step = (): Individual => {
    while (outstanding.length < lookahead) {
      const birth = machine.propose(stream(options.seed, 'birth', island, births + 1))
      if (birth === 'wait') break
      outstanding.push(individualOf(island, ++births, birth, options.score(birth.genome)))
    }
    const next = outstanding.shift()
    if (!next) throw new Error('the method waits although nothing is outstanding')
    machine.commit(next, stream(options.seed, 'commit', island, ++commits))
    return next
  }
  const steps = (count: number): Individual => {
    for (let k = 1; k < count; k++) step()
    return step()
  }
  return { machine, step, steps }
}

/** Genomes that are one number: the founder's place in line. Children inherit it; nothing mutates. */
export function labels(): Variation {
  let founders = 0
  return {
    founder: () => ({ label: Int32Array.of(founders++) }),
    cross: (a) => a,
    mutate: (genome) => genome,
    distance: (a, b) => (labelOf(a) === labelOf(b) ? 0 : 1),
  }
}

export function labelOf(genome: Genome): number {
  return genome.label![0]!
}

/** Bit strings of length n from `founder`, changed by `mutate`; never crossed. */
export function bitStrings(
  n: number,
  mutate: (bits: Uint8Array, draws: Stream) => void,
  founder: (bits: Uint8Array, draws: Stream) => void = randomBits,
): Variation {
  return {
    founder: (draws) => {
      const bits = new Uint8Array(n)
      founder(bits, draws)
      return { bits }
    },
    cross: (a) => a,
    mutate: (genome, draws) => {
      const bits = bitsOf(genome).slice()
      mutate(bits, draws)
      return { bits }
    },
    distance: () => 0,
  }
}

export function bitsOf(genome: Genome): Uint8Array {
  return genome.bits as Uint8Array
}

export function randomBits(bits: Uint8Array, draws: Stream): void {
  for (let i = 0; i < bits.length; i++) bits[i] = draws.below(2)
}

export interface Estimate {
  readonly mean: number
  /** Four standard errors of the mean. */
  readonly band: number
}

/** Mean of a sample with its 4-standard-error band, the standard deviation taken from the sample. */
export function estimateOf(sample: readonly number[]): Estimate {
  const mean = sample.reduce((sum, x) => sum + x, 0) / sample.length
  const variance = sample.reduce((sum, x) => sum + (x - mean) ** 2, 0) / (sample.length - 1)
  return { mean, band: 4 * Math.sqrt(variance / sample.length) }
}

/** Four standard errors of a share of `runs` whose expectation is p. */
export function shareBand(p: number, runs: number): number {
  return 4 * Math.sqrt((p * (1 - p)) / runs)
}

/** Pearson's statistic of counts against expected chances. */
export function chiSquare(counts: readonly number[], chances: readonly number[]): number {
  const total = counts.reduce((sum, count) => sum + count, 0)
  return counts.reduce((sum, count, k) => sum + (count - total * chances[k]!) ** 2 / (total * chances[k]!), 0)
}
