// Neutral evolution: on a flat landscape nothing is preferred, so labels must drift exactly as population genetics
// says. One check for parent choice, replacement, ties and the order of commits together. Wright and Fisher's
// model is `generational` with even parents; Moran's (Random processes in genetics, 1958, from memory) is
// `steady-state` with even parents and random replacement, and `drift`. Expectations recomputed exactly (absorbing
// chains). Seeds were chosen beforehand: 26000 and on; bands are four standard errors.

import { describe, expect, test } from 'vitest'
import { drift } from '../../coordinator/evolution/methods/drift.js'
import { generational } from '../../coordinator/evolution/methods/generational.js'
import { steadyState } from '../../coordinator/evolution/methods/steady-state.js'
import type { Individual, Method, Settings } from '../../coordinator/evolution/types.js'
import { chiSquare, type Drive, drive, estimateOf, labelOf, labels, shareBand } from './drive.js'

/** Fifty members need some seconds of one processor: minutes where many share it. */
const patientMs = 180_000

const copying: Settings = { crossoverChance: 0, mutationChance: 0 }
const wrightFisher: Settings = { ...copying, tournament: 1, elites: 0 }
const moran: Settings = { ...copying, tournament: 1, replace: 'random' }

function flat(method: Method, population: number, settings: Settings, seed: number, lookahead = 1): Drive {
  const started = drive({
    method,
    population,
    settings,
    variation: labels(),
    score: () => [0],
    seed,
    lookahead,
  })
  started.steps(population)
  return started
}

function countsOf(members: readonly Individual[]): number[] {
  const counts: number[] = []
  for (const member of members) {
    const label = labelOf(member.genome)
    counts[label] = (counts[label] ?? 0) + 1
  }
  return counts
}

/** Chance that two members drawn with replacement differ. */
function heterozygosity(members: readonly Individual[]): number {
  return countsOf(members).reduce((left, count) => left - (count / members.length) ** 2, 1)
}

interface Fate {
  /** Steps until every member has the label, or none. */
  readonly time: number
  readonly fixed: boolean
}

function fateOf(started: Drive, label: number, commitsPerStep: number): Fate {
  const { machine, steps } = started
  for (let time = 0; ; time++) {
    const copies = machine.members().filter((member) => labelOf(member.genome) === label).length
    if (copies === 0 || copies === machine.members().length) return { time, fixed: copies > 0 }
    steps(commitsPerStep)
  }
}

interface Expected {
  readonly population: number
  readonly absorption: number
  readonly fixation: number
}

function expectFates(fates: readonly Fate[], { population, absorption, fixation }: Expected): void {
  const all = estimateOf(fates.map((fate) => fate.time))
  expect(Math.abs(all.mean - absorption)).toBeLessThan(all.band)
  const fixed = fates.filter((fate) => fate.fixed)
  expect(Math.abs(fixed.length / fates.length - 1 / population)).toBeLessThan(
    shareBand(1 / population, fates.length),
  )
  const times = estimateOf(fixed.map((fate) => fate.time))
  expect(Math.abs(times.mean - fixation)).toBeLessThan(times.band)
  expect(times.band).toBeLessThan((population > 20 ? 0.3 : 0.2) * fixation)
}

describe('Wright and Fisher: generational, even parents', () => {
  test.each([
    [20, 20, 1000],
    [50, 50, 900],
  ])(
    'heterozygosity of %i falls by 1 - 1/N a generation, %i generations',
    (population, generations, runs) => {
      const after: number[] = []
      for (let run = 0; run < runs; run++) {
        const { machine, steps } = flat(generational, population, wrightFisher, 26000 + run)
        steps(generations * population)
        after.push(heterozygosity(machine.members()))
      }
      const { mean, band } = estimateOf(after)
      // Founders all differ: 1 - 1/N at the start. For 50: 0.3641696801 of it.
      expect(Math.abs(mean - (1 - 1 / population) ** (generations + 1))).toBeLessThan(band)
      expect(band).toBeLessThan(0.03)
    },
    patientMs,
  )

  test.each<Expected>([
    { population: 10, absorption: 5.75327649, fixation: 17.49562023 },
    { population: 20, absorption: 7.23121926, fixation: 37.27206449 },
    { population: 50, absorption: 9.12679466, fixation: 96.97119769 },
  ])(
    'fate of one copy among $population',
    (expected) => {
      const { population } = expected
      // Fixed in one of N: enough of those for a band of a fifth, or of three tenths for 50.
      const fates = Array.from({ length: population > 20 ? 4000 : 3000 }, (_, run) =>
        fateOf(flat(generational, population, wrightFisher, 27000 + run), 0, population),
      )
      expectFates(fates, expected)
    },
    patientMs,
  )
})

describe('Moran: steady state, even parents, random replacement', () => {
  test.each([
    ['steady-state', steadyState, moran],
    ['drift', drift, copying],
  ] as const)('%s: heterozygosity falls by 1 - 2/N^2 an insertion', (_name, method, settings) => {
    const population = 20
    const insertions = 200
    const after: number[] = []
    for (let run = 0; run < 1000; run++) {
      const { machine, steps } = flat(method, population, settings, 26000 + run)
      steps(insertions)
      after.push(heterozygosity(machine.members()))
    }
    const { mean, band } = estimateOf(after)
    expect(Math.abs(mean - (1 - 1 / population) * (1 - 2 / population ** 2) ** insertions)).toBeLessThan(band)
    expect(band).toBeLessThan(0.03)
  })

  test.each<Expected>([
    { population: 10, absorption: 28.28968254, fixation: 90 },
    { population: 50, absorption: 223.96026692, fixation: 2450 },
  ])(
    'fate of one copy among $population: N(N-1) insertions to fixation',
    (expected) => {
      const { population } = expected
      const fates = Array.from({ length: population > 20 ? 4000 : 5000 }, (_, run) =>
        fateOf(flat(steadyState, population, moran, 28000 + run), 0, 1),
      )
      expectFates(fates, expected)
    },
    patientMs,
  )
})

describe('no hidden preference: every founder has the same chance to take over', () => {
  /** 0.9999 quantile of chi-square with 7 degrees of freedom. */
  const chiSquareLimit = 29.8775
  const population = 8

  // Ties are everywhere here: tournaments of three and every rule that compares the child with its victim. Nor may
  // the window of outstanding births prefer anybody: it would if the first founders bred before the last is there.
  test.each([
    ['worst', 1],
    ['worst', 20],
    ['random', 5],
    ['tournament', 20],
  ] as const)('steady-state, replace: %s, lookahead %i', (replace, lookahead) => {
    const settings = { ...copying, tournament: 3, replace }
    const winners = new Array<number>(population).fill(0)
    for (let run = 0; run < 1200; run++) {
      const { machine, step } = flat(steadyState, population, settings, 29000 + run, lookahead)
      const first = () => labelOf(machine.members()[0]!.genome)
      while (machine.members().some((member) => labelOf(member.genome) !== first())) step()
      winners[first()]!++
    }
    expect(chiSquare(winners, new Array<number>(population).fill(1 / population))).toBeLessThan(
      chiSquareLimit,
    )
  })

  test.each([1, 3])('generational, tournament of %i, no elites', (tournament) => {
    const winners = new Array<number>(population).fill(0)
    for (let run = 0; run < 1200; run++) {
      const settings = { ...copying, tournament, elites: 0 }
      const { machine, steps } = flat(generational, population, settings, 29000 + run, population)
      while (heterozygosity(machine.members()) > 0) steps(population)
      winners[labelOf(machine.members()[0]!.genome)]!++
    }
    expect(chiSquare(winners, new Array<number>(population).fill(1 / population))).toBeLessThan(
      chiSquareLimit,
    )
  })
})
