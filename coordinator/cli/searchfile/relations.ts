// What the fields of a search file mean to each other. Rows of two tables: `impossible` are refused with the
// reason, `poor` are warnings: the search runs, but not as anybody would want.
//
// A row looks at fields that are right by themselves, and says what it finds; what is wrong elsewhere in the file does not
// hide it.

import { limits } from '../../../shared/limits.js'
import type { Needs } from '../../../shared/needs.js'
import { splitBudget } from '../../evolution/budget.js'
import { topologies } from '../../evolution/migration.js'
import { defaultSettings } from '../../evolution/settings.js'
import { eitherOf, type Finding } from './finding.js'
import { nearestName } from './nearest.js'
import type { FieldKey, IslandGroup, SearchFile } from './schema.js'
import type { MethodRow, SearchTables } from './tables.js'
import type { FieldPath } from './text.js'

/** What is known when relations are looked at; the problem is absent where it could not be loaded. */
export interface Subject {
  readonly file: SearchFile
  readonly tables: SearchTables
  /** Simulations that one replicate costs, at least 1. */
  readonly casesPerReplicate: number
  readonly objectives: number | undefined
  /** Licences that one simulation holds; absent where the problem could not be loaded. */
  readonly tokens?: Needs['tokens']
  /** Time now in milliseconds, for `until`; absent where there is no clock. */
  readonly nowMs?: number
  /** Mean expected cost of an evaluation; absent where the problem could not be asked. */
  readonly meanCost?: number
}

export type Complaint = Pick<Finding, 'found' | 'expected'> & {
  readonly path: FieldPath
  readonly advice?: string
}
type Look = (subject: Subject) => Complaint[]

export interface Rule {
  /** Fields it reads: it is asked only when they are right by themselves. */
  readonly needs: readonly FieldKey[]
  readonly look: Look
}

function rule(needs: readonly FieldKey[], look: Look): Rule {
  return { needs, look }
}

export function methodOf(tables: SearchTables, name: string): MethodRow | undefined {
  return tables.methods.find((method) => method.name === name)
}

/** Members of an island of this group; the method's own default where the file names none. */
export function populationOf(
  tables: SearchTables,
  group: Pick<IslandGroup, 'population' | 'method'>,
): number {
  return group.population ?? methodOf(tables, group.method)?.defaultPopulation ?? 1
}

export function islandCount(file: SearchFile): number {
  return file.islands.reduce((sum, group) => sum + group.count, 0)
}

/** Weight of an island of the group in the split of the budget. */
export function shareOf(group: IslandGroup): number {
  return group.share ?? group.lookahead
}

const quotasOfFile = new WeakMap<SearchFile, number[]>()

/** Simulations an island of each group gets, by the rule of coordinator/evolution/budget.ts (the smallest of the group). */
export function quotas(file: SearchFile): number[] {
  const known = quotasOfFile.get(file)
  if (known) return known
  const shares = file.islands.flatMap((group) => Array<number>(group.count).fill(shareOf(group)))
  const split = splitBudget(file.budget.simulations, shares)
  let first = 0
  const smallest = file.islands.map((group) => {
    first += group.count
    return split[first - 1]!
  })
  quotasOfFile.set(file, smallest)
  return smallest
}

function eachGroup(
  subject: Subject,
  look: (group: IslandGroup, path: FieldPath) => Complaint | undefined,
): Complaint[] {
  return subject.file.islands.flatMap((group, index) => look(group, ['islands', index]) ?? [])
}

/** Settings of methods that count members: none may be larger than the population. */
const memberCounts: { readonly [setting: string]: string } = {
  tournament: 'a tournament draws different members',
  elites: 'elites are members of the population',
  newcomers: 'newcomers are counted among as many births as the population has members',
}

export const impossible: { readonly [rule: string]: Rule } = {
  tooManyIslands: rule(['islands'], ({ file }) => {
    const count = islandCount(file)
    if (count <= limits.islandsMost) return []
    return [
      { path: ['islands'], found: `${count} islands in all`, expected: `at most ${limits.islandsMost}` },
    ]
  }),

  settingAbovePopulation: rule(['islands'], (subject) =>
    eachGroup(subject, (group, path) => {
      const population = populationOf(subject.tables, group)
      const defaults = defaultSettings(methodOf(subject.tables, group.method)?.settings ?? {})
      const [name, value] = Object.entries({ ...defaults, ...group.settings }).find(
        ([setting, count]) => setting in memberCounts && typeof count === 'number' && count > population,
      ) ?? [undefined, undefined]
      if (name === undefined) return undefined
      return {
        path: [...path, 'settings', name],
        found: `${name} ${value} on an island of ${population}`,
        expected: `at most ${population}, because ${memberCounts[name]}`,
      }
    }),
  ),

  licencesMissing: rule(['tokens'], ({ file, tokens = {} }) =>
    Object.entries(tokens).flatMap(([name, count]): Complaint[] => {
      const there = file.tokens[name]
      if (there !== undefined && there >= count) return []
      const meant = there === undefined ? nearestName(name, Object.keys(file.tokens)) : undefined
      return [
        {
          path: there === undefined ? ['tokens'] : ['tokens', name],
          found: `${there ?? 'nothing'} of the licence ${name}`,
          expected: `${count} or more, because one simulation of the problem holds so many`,
          advice: meant
            ? `The problem asks for "${name}": did the file mean that by "${meant}"?`
            : `Say how many the site has: tokens: { ${name}: ${count} }`,
        },
      ]
    }),
  ),

  oneObjectiveMethod: rule(['islands'], (subject) =>
    eachGroup(subject, (group, path) => {
      const method = methodOf(subject.tables, group.method)
      if (method?.objectives !== 'one' || subject.objectives === undefined || subject.objectives < 2)
        return undefined
      const others = subject.tables.methods.filter((row) => row.objectives === 'any').map((row) => row.name)
      return {
        path: [...path, 'method'],
        found: `${group.method}, which ranks by one objective, for a problem with ${subject.objectives}`,
        expected: `a method for several objectives: ${others.join(', ')}`,
      }
    }),
  ),

  shareOnSomeGroups: rule(['islands'], ({ file }) => {
    const without = file.islands.findIndex((group) => group.share === undefined)
    if (without < 0 || file.islands.every((group) => group.share === undefined)) return []
    return [
      {
        path: ['islands', without],
        found: 'no share here, but one on another group',
        expected: 'share on every group of islands or on none',
        advice: 'Where no group has one, the budget is split in proportion to lookahead.',
      },
    ]
  }),

  emigrantsAbovePopulation: rule(['islands', 'migration'], ({ file, tables }) => {
    const migration = file.migration
    if (migration === undefined || migration === 'none') return []
    const smallest = Math.min(...file.islands.map((group) => populationOf(tables, group)))
    if (migration.emigrants <= smallest) return []
    return [
      {
        path: ['migration', 'emigrants'],
        found: `${migration.emigrants} emigrants, but the smallest island has ${smallest} members`,
        expected: `at most ${smallest}`,
        advice: 'One to three emigrants are usual; many make all islands alike.',
      },
    ]
  }),

  topologyMisfit: rule(['islands', 'migration'], ({ file }) => {
    const migration = file.migration
    if (migration === undefined || migration === 'none') return []
    const count = islandCount(file)
    const misfit = topologies[migration.topology].misfit(count)
    if (misfit === undefined || count < 2) return []
    return [
      {
        path: ['migration', 'topology'],
        found: `${migration.topology} with ${count} islands`,
        expected: misfit,
        advice: 'Change the number of islands (count), or use ring, two-way-ring, complete or random.',
      },
    ]
  }),

  replicateBlocks: rule(['replicates'], ({ file }) => {
    const { first, topUp, most } = file.replicates
    if (most === undefined) return []
    if (most < first) {
      return [
        {
          path: ['replicates', 'most'],
          found: `most ${most}`,
          expected: `at least first, which is ${first}`,
        },
      ]
    }
    if (topUp === 0 || most === first || first + topUp <= most) return []
    return [
      {
        path: ['replicates', 'topUp'],
        found: `topUp ${topUp}, but after the first ${first} only ${most - first} are left up to most ${most}`,
        expected: `at most ${most - first}`,
      },
    ]
  }),

  blockTooLarge: rule(['replicates'], ({ file, casesPerReplicate }) => {
    const largest = Math.max(file.replicates.first, file.replicates.topUp)
    const rows = largest * casesPerReplicate
    if (rows <= limits.simulationsPerEvaluation) return []
    return [
      {
        path: ['replicates'],
        found: `${largest} replicates of ${casesPerReplicate} cases, ${rows} simulations in one evaluation`,
        expected: `at most ${limits.simulationsPerEvaluation}`,
      },
    ]
  }),

  quotaBelowOneEvaluation: rule(['islands', 'budget', 'replicates'], ({ file, casesPerReplicate }) => {
    const block = file.replicates.first * casesPerReplicate
    const group = quotas(file).findIndex((quota) => quota < block)
    if (group < 0) return []
    return [
      {
        path: ['budget', 'simulations'],
        found: `${file.budget.simulations} simulations, of which islands[${group}] would get ${quotas(file)[group]}`,
        expected: `at least ${block} for every island: one evaluation of ${file.replicates.first} replicates`,
      },
    ]
  }),
}

/** How much longer than all others an island may last before it is called late. Common practice, no source. */
const lateFactor = 2

/** How many rounds an island of each group lasts, if every individual is simulated `first` times. */
function roundsOfGroups({ file, casesPerReplicate, meanCost }: Subject): number[] {
  return quotas(file).map(
    (quota, index) =>
      (quota * (meanCost ?? 1)) /
      (file.replicates.first * casesPerReplicate * file.islands[index]!.lookahead),
  )
}

function roundWords({ meanCost }: Subject): string {
  const round = 'In a round each slot of the lookahead works off one unit of expected cost'
  if (meanCost === undefined || meanCost === 1) return `${round}, here one evaluation`
  return `${round}; an evaluation costs about ${Number(meanCost.toPrecision(3))}`
}

export const poor: { readonly [rule: string]: Rule } = {
  lookaheadAbovePopulation: rule(['islands'], (subject) =>
    eachGroup(subject, (group, path) => {
      const population = populationOf(subject.tables, group)
      if (group.lookahead <= population) return undefined
      return {
        path: [...path, 'lookahead'],
        found: `lookahead ${group.lookahead} above the population of ${population}`,
        expected: 'a lookahead up to the population',
        advice: `Children are bred from a population that is ${group.lookahead - 1} results old: enlarge the population or use more islands.`,
      }
    }),
  ),

  lookaheadBelowWorkers: rule(['islands', 'workersExpected'], ({ file }) => {
    if (file.workersExpected === undefined) return []
    const total = file.islands.reduce((sum, group) => sum + group.count * group.lookahead, 0)
    if (total >= file.workersExpected) return []
    return [
      {
        path: ['workersExpected'],
        found: `${file.workersExpected} workers, but lookaheads of ${total} in all`,
        expected: 'lookaheads that sum to 1.5 times the workers or more',
        advice: `At least ${file.workersExpected - total} workers would always be idle.`,
      },
    ]
  }),

  quotaBelowOneGeneration: rule(['islands', 'budget', 'replicates'], (subject) => {
    const { file, tables, casesPerReplicate } = subject
    const split = quotas(file)
    return subject.file.islands.flatMap((group, index) => {
      const population = populationOf(tables, group)
      const founders = population * file.replicates.first * casesPerReplicate
      if (split[index]! >= 2 * founders) return []
      const what =
        split[index]! < founders ? 'not even all founders' : 'less than one generation after the founders'
      return {
        path: ['budget', 'simulations'] as FieldPath,
        found: `${split[index]} simulations for an island of islands[${index}]: ${what}`,
        expected: `${2 * founders} or more for a population of ${population}`,
        advice: 'Enlarge the budget, or use a smaller population or fewer islands.',
      }
    })
  }),

  migrationNeverHappens: rule(['islands', 'budget', 'replicates', 'migration'], (subject) => {
    const { migration } = subject.file
    if (migration === undefined || migration === 'none' || islandCount(subject.file) < 2) return []
    const fewest = Math.min(...roundsOfGroups(subject))
    const needed = migration.every * (migration.lag + 1)
    if (fewest >= needed) return []
    return [
      {
        path: ['migration', 'every'],
        found: `every ${migration.every} rounds with lag ${migration.lag}, but an island lasts about ${Math.floor(fewest)} rounds`,
        expected: `at most ${Math.max(1, Math.floor(fewest / (migration.lag + 1)))} rounds, so that somebody arrives`,
        advice: `${roundWords(subject)}: use a shorter interval or a larger budget.`,
      },
    ]
  }),

  epochBelowOneEvaluation: rule(['islands', 'migration'], (subject) => {
    const { migration } = subject.file
    if (migration === undefined || migration === 'none' || islandCount(subject.file) < 2) return []
    const { meanCost } = subject
    if (meanCost === undefined || migration.every >= meanCost) return []
    return [
      {
        path: ['migration', 'every'],
        found: `every ${migration.every} rounds, which is less than one evaluation for each slot of the lookahead`,
        expected: `${Number((10 * meanCost).toPrecision(2))} rounds or so: ten evaluations for each slot`,
        advice: `${roundWords(subject)}. Islands that trade all the time become one population.`,
      },
    ]
  }),

  lateIsland: rule(['islands', 'budget', 'replicates'], (subject) => {
    if (subject.file.islands.length < 2) return []
    const rounds = roundsOfGroups(subject)
    const longest = rounds.indexOf(Math.max(...rounds))
    const others = Math.max(...rounds.filter((_, group) => group !== longest))
    if (!(rounds[longest]! > lateFactor * others)) return []
    const { count, lookahead } = subject.file.islands[longest]!
    return [
      {
        path: ['islands', longest],
        found: `about ${Math.round(rounds[longest]!)} rounds of work, the other islands at most ${Math.round(others)}`,
        expected: 'quotas (share) in proportion to lookahead, so that islands end at about the same time',
        advice: `At the end only ${count * lookahead} evaluations would be under way: give these islands more lookahead or less share.`,
      },
    ]
  }),

  migrationOfOne: rule(['islands', 'migration'], ({ file }) => {
    if (file.migration === undefined || file.migration === 'none' || islandCount(file) > 1) return []
    return [
      {
        path: ['migration'],
        found: 'migration with a single island',
        expected: 'two islands or more, or migration: none',
        advice: 'The field has no effect.',
      },
    ]
  }),

  migrationUnsaid: rule(['islands', 'migration'], ({ file }) => {
    if (file.migration !== undefined || islandCount(file) < 2) return []
    return [
      {
        path: ['islands'],
        found: `${islandCount(file)} islands and no word about migration`,
        expected: 'migration, or migration: none',
        advice: 'Without the field the islands never exchange anybody.',
      },
    ]
  }),

  licencesUnused: rule(['tokens'], ({ file, tokens }) => {
    if (tokens === undefined) return []
    return Object.keys(file.tokens)
      .filter((name) => !Object.hasOwn(tokens, name))
      .map((name) => ({
        path: ['tokens', name],
        found: `the licence ${name}, which the problem does not ask for`,
        expected: Object.keys(tokens).length === 0 ? 'no licences' : eitherOf(Object.keys(tokens)),
        advice: 'Delete it, or name it in the needs of the problem.',
      }))
  }),

  unevenTopUps: rule(['replicates'], ({ file }) => {
    const { first, topUp, most } = file.replicates
    if (most === undefined || most <= first) return []
    if (topUp > 0 && (most - first) % topUp === 0) return []
    const found =
      topUp === 0 ? `most ${most} without topUp` : `first ${first} and blocks of ${topUp} up to ${most}`
    return [
      {
        path: ['replicates', 'most'],
        found,
        expected: 'first plus a whole number of top-ups',
        advice:
          topUp === 0
            ? `No individual gets more than ${first}.`
            : 'The last block is smaller than the others.',
      },
    ]
  }),

  arrivalOrder: rule(['islands'], (subject) =>
    eachGroup(subject, (group, path) => {
      if (group.order !== 'arrival') return undefined
      return {
        path: [...path, 'order'],
        found: 'order arrival',
        expected: 'proposal or cost, where the search shall be repeatable',
        advice: 'This search can be re-derived from its journal, but not repeated from this file alone.',
      }
    }),
  ),

  untilPast: rule(['budget'], ({ file, nowMs }) => {
    const until = file.budget.until
    if (until === undefined || nowMs === undefined || Date.parse(until) > nowMs) return []
    return [
      {
        path: ['budget', 'until'],
        found: `${until}, which is past`,
        expected: 'a time to come',
        advice: 'The search would end at its first epoch.',
      },
    ]
  }),
}
