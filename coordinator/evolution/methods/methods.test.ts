// Promises that every method keeps, on random small problems: any order of commits, any lookahead, failures,
// corrections, arrivals and restarts from a snapshot at any moment.

import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import type { Genome } from '../../../shared/genome.js'
import { numberOf } from '../../../shared/ids.js'
import { stream } from '../../../shared/streams.js'
import { contextOf, drive, individualOf } from '../../../tests/reference/drive.js'
import type { Birth, Individual, Method, MethodMachine, Placement, Settings, Variation } from '../types.js'
import { methodNamed, methods } from './index.js'
import { byParetoRank } from './pareto-ranking.js'

type Move =
  | { readonly kind: 'commit'; readonly pick: number }
  | {
      readonly kind: 'arrive'
      readonly scores: readonly number[]
      readonly placement: Placement
      readonly returning: number
    }
  | { readonly kind: 'correct'; readonly pick: number; readonly score: number }
  | { readonly kind: 'restart' }

interface World {
  readonly method: Method
  readonly population: number
  readonly objectives: number
  readonly lookahead: number
  readonly seed: number
  readonly settings: Settings
  readonly moves: readonly Move[]
}

/** Scores are few whole numbers, so that ties are common; the largest one stands for a failure. */
const failure = 7
const scoreNumber = fc.integer({ min: 0, max: failure })
const placement = fc.constantFrom<Placement>('worst', 'random', 'if-better')
const move = fc.oneof(
  { weight: 12, arbitrary: fc.record({ kind: fc.constant('commit' as const), pick: fc.nat(11) }) },
  {
    weight: 1,
    arbitrary: fc.record({
      kind: fc.constant('arrive' as const),
      scores: fc.array(scoreNumber, { minLength: 1, maxLength: 4 }),
      placement,
      returning: fc.nat(5),
    }),
  },
  {
    weight: 1,
    arbitrary: fc.record({ kind: fc.constant('correct' as const), pick: fc.nat(20), score: scoreNumber }),
  },
  { weight: 1, arbitrary: fc.constant({ kind: 'restart' as const }) },
)

function settingsOf(method: Method): fc.Arbitrary<Settings> {
  const rows = Object.entries(method.settings).map(([name, row]) => {
    if (row.kind === 'choice') return [name, fc.constantFrom(...row.options)] as const
    const high = Math.min(row.high, Math.max(row.low + 1, 3))
    return [
      name,
      row.kind === 'integer'
        ? fc.integer({ min: row.low, max: high })
        : fc.double({ min: row.low, max: high, noNaN: true }),
    ] as const
  })
  return fc.record(Object.fromEntries(rows)) as fc.Arbitrary<Settings>
}

function worlds(method: Method, length = 120): fc.Arbitrary<World> {
  return fc.record({
    method: fc.constant(method),
    population: fc.integer({ min: 1, max: 8 }),
    objectives: method.objectives === 'one' ? fc.constant(1) : fc.integer({ min: 1, max: 3 }),
    lookahead: fc.integer({ min: 1, max: 12 }),
    seed: fc.nat(2 ** 31),
    settings: settingsOf(method),
    moves: fc.array(move, { minLength: 20, maxLength: length }),
  })
}

const variation: Variation = {
  founder: (draws) => ({ x: Int32Array.of(draws.below(1000)) }),
  cross: (a, b, draws) => ({ x: Int32Array.of(draws.below(2) === 0 ? a.x![0]! : b.x![0]!) }),
  mutate: (genome, draws) => ({ x: Int32Array.of((genome.x![0]! + draws.below(5) + 998) % 1000) }),
  distance: () => 0,
}

function scoresFrom(first: number, objectives: number): number[] {
  if (first === failure) return new Array<number>(objectives).fill(Number.POSITIVE_INFINITY)
  return Array.from({ length: objectives }, (_, m) => (first + 3 * m) % failure)
}
function scoreOf(genome: Genome, world: World): number[] {
  return scoresFrom(stream(world.seed, 'spare', 0, 0, genome.x![0]!).below(failure + 1), world.objectives)
}

/** Everything a machine did, for comparison. */
interface Story {
  readonly births: readonly Birth[]
  readonly members: readonly (readonly string[])[]
}
interface Watch {
  readonly machine: MethodMachine
  readonly before: readonly Individual[]
  readonly world: World
  readonly move: Move
}

/** Plays the moves. `restarts`: whether a restart really restores from a snapshot. `watch` sees every move. */
function play(world: World, restarts: boolean, watch: (seen: Watch) => void = () => {}): Story {
  const context = contextOf({ ...world, variation })
  let machine = world.method.create(context)
  let outstanding: Individual[] = []
  const births: Birth[] = []
  const members: string[][] = []
  let commits = 0
  let strangers = 0
  let known: Individual[] = []
  const fill = (): void => {
    while (outstanding.length < world.lookahead) {
      const birth = machine.propose(stream(world.seed, 'birth', 1, births.length + 1))
      if (birth === 'wait') break
      births.push(birth)
      outstanding.push(individualOf(1, births.length, birth, scoreOf(birth.genome, world)))
    }
    if (outstanding.length === 0) throw new Error('a method that waits for nothing waits for ever')
  }
  const actions: { readonly [K in Move['kind']]: (move: Extract<Move, { kind: K }>) => void } = {
    commit: ({ pick }) => {
      const [one] = outstanding.splice(pick % outstanding.length, 1)
      machine.commit(one!, stream(world.seed, 'commit', 1, ++commits))
      known.push(one!)
    },
    arrive: ({ scores, placement, returning }) => {
      const arrivals = scores.map((score) => {
        const birth: Birth = {
          genome: { x: Int32Array.of(score) },
          parents: [],
          origin: 'founder',
          age: score % 3,
        }
        return individualOf(2, ++strangers, birth, scoresFrom(score, world.objectives))
      })
      // Sometimes one comes home, and sometimes one comes twice.
      const home = known[known.length - 1 - returning]
      if (home) arrivals.push({ ...home })
      if (returning === 0) arrivals.push({ ...arrivals[0]! })
      machine.immigrate(arrivals, placement, stream(world.seed, 'arrivals', 1, commits))
    },
    correct: ({ pick, score }) => {
      const held = machine.held()
      const one = held.length > 0 && pick < 15 ? held[pick % held.length]! : known[0]
      if (!one) return
      one.score = Float64Array.from(scoresFrom(score, world.objectives))
      machine.reconsider(one)
    },
    restart: () => {
      if (!restarts) return
      const saved = structuredClone({ state: machine.save(), held: machine.held(), outstanding, known })
      outstanding = saved.outstanding
      known = saved.known
      machine = world.method.restore(context, saved.state, (id) => {
        const one = saved.held.find((individual) => individual.id === id)
        if (!one) throw new Error(`a snapshot names ${id}, which was not held`)
        return one
      })
    },
  }
  for (const one of world.moves) {
    fill()
    const before = [...machine.members()]
    ;(actions[one.kind] as (move: Move) => void)(one)
    watch({ machine, before, world, move: one })
    members.push(machine.members().map((member) => `${member.id}/${member.age}/${[...member.score]}`))
  }
  return { births, members }
}

const runs = { numRuns: 40, seed: 44000 }
const ids = (some: readonly Individual[]): number[] => some.map((one) => one.id)

function mostMembers({ method, population, objectives, settings }: World): number {
  if (method.name !== 'age-fitness-pareto') return population
  return Math.max(population, Math.floor(Number(settings.frontLimit) * population), 2 * (objectives + 1))
}

describe.each(methods.map((method) => [method.name, method] as const))('%s', (_name, method) => {
  test('never has more members than seats, nobody sits twice, and ranked() is a total order of the members', () => {
    fc.assert(
      fc.property(worlds(method), (world) => {
        play(world, false, ({ machine }) => {
          const members = ids(machine.members())
          if (members.length > mostMembers(world)) throw new Error('more members than seats')
          const held = ids(machine.held())
          const everybody = new Set(held)
          if (everybody.size < held.length) throw new Error('somebody sits twice')
          if (!members.every((id) => everybody.has(id))) throw new Error('a member is not held')
          if (`${ids(machine.ranked()).toSorted()}` !== `${members.toSorted()}`)
            throw new Error('ranked() differs')
        })
      }),
      runs,
    )
  })

  test('seats once taken stay taken, whatever is committed or arrives', () => {
    fc.assert(
      fc.property(worlds(method), (world) => {
        play(world, false, ({ machine, before }) => {
          const taken = Math.min(before.length, world.population)
          if (machine.members().length < taken) throw new Error('a seat is gone')
        })
      }),
      runs,
    )
  })

  test('the same streams give the same births', () => {
    fc.assert(
      fc.property(worlds(method), (world) => {
        expect(play(world, false)).toEqual(play(world, false))
      }),
      { ...runs, numRuns: 20 },
    )
  })

  test('restored from a snapshot at any moment it goes on as if nothing had happened', () => {
    fc.assert(
      fc.property(worlds(method), (world) => {
        expect(play(world, true)).toEqual(play(world, false))
      }),
      runs,
    )
  })

  test('arrivals with placement worst or if-better never cost the best of one objective', () => {
    fc.assert(
      fc.property(worlds(method), (world) => {
        if (world.objectives > 1) return
        play(world, false, ({ machine, before, move }) => {
          if (move.kind !== 'arrive' || move.placement === 'random' || before.length === 0) return
          const best = (some: readonly Individual[]) => Math.min(...some.map((one) => one.score[0]!))
          if (best(machine.members()) > best(before)) throw new Error('the best is lost')
        })
      }),
      runs,
    )
  })

  test('every birth says truly where it comes from', () => {
    fc.assert(
      fc.property(worlds(method), (world) => {
        const { births } = play(world, false)
        const parentsOf = { founder: 0, mutated: 1, copied: 1, crossed: 2, 'crossed-mutated': 2 }
        const odd = births.filter(
          ({ parents, origin }) =>
            parents.length !== parentsOf[origin] || new Set(parents).size < parents.length,
        )
        expect(odd).toEqual([])
        const founders = births.filter((birth) => birth.origin === 'founder').length
        const expected = method.name === 'one-plus-lambda' ? 1 : Math.min(world.population, births.length)
        expect(founders).toBeGreaterThanOrEqual(expected)
      }),
      runs,
    )
  })
})

describe('nobody breeds before all founders are committed', () => {
  test.each(
    methods
      .filter((method) => method.name !== 'random-sampling')
      .map((method) => [method.name, method] as const),
  )('%s', (_name, method) => {
    fc.assert(
      fc.property(worlds(method, 40), (world) => {
        const founders = method.name === 'one-plus-lambda' ? 1 : world.population
        const { births } = play(
          { ...world, moves: world.moves.filter((one) => one.kind === 'commit') },
          false,
        )
        for (const birth of births.slice(0, founders)) expect(birth.origin).toBe('founder')
        // One founder is still outstanding when the last of these is committed: the wide window holds no child.
        const moves = Array.from({ length: founders }, () => ({ kind: 'commit', pick: 0 }) as const)
        expect(play({ ...world, lookahead: 1000, moves }, false).births.length).toBe(founders)
      }),
      { ...runs, numRuns: 20 },
    )
  })
})

describe('who survives', () => {
  const elitist: readonly [string, Settings][] = [
    ['steady-state', { replace: 'worst' }],
    ['steady-state', { replace: 'tournament' }],
    ['steady-state', { replace: 'parent' }],
    ['generational', { elites: 1 }],
    ['nsga-ii', {}],
    ['age-fitness-pareto', {}],
    ['one-plus-lambda', {}],
    ['random-sampling', {}],
  ]
  test.each(elitist)('%s %o never loses its best', (name, settings) => {
    const method = methodNamed(name)
    fc.assert(
      fc.property(worlds(method), (drawn) => {
        const world: World = {
          ...drawn,
          objectives: 1,
          population: Math.max(drawn.population, 2),
          settings: { ...drawn.settings, ...settings },
          moves: drawn.moves.filter((one) => one.kind === 'commit'),
        }
        let best = Number.POSITIVE_INFINITY
        play(world, false, ({ machine }) => {
          const now = Math.min(...machine.members().map((member) => member.score[0]!))
          if (now > best) throw new Error('the best is lost')
          best = now
        })
      }),
      runs,
    )
  })

  test('steady-state: a failed child never takes the seat of one that works, unless every child enters', () => {
    const method = methodNamed('steady-state')
    fc.assert(
      fc.property(worlds(method), fc.constantFrom('worst', 'tournament', 'parent'), (drawn, replace) => {
        const moves = drawn.moves.filter((one) => one.kind === 'commit')
        const world = { ...drawn, settings: { ...drawn.settings, replace }, moves }
        const working = (some: readonly Individual[]) => some.filter((one) => one.score[0]! < Infinity).length
        play(world, false, ({ machine, before }) => {
          expect(working(machine.members())).toBeGreaterThanOrEqual(working(before))
        })
      }),
      runs,
    )
  })

  test('random-sampling keeps the best `population` of all it has seen, ranked again with every newcomer', () => {
    const method = methodNamed('random-sampling')
    fc.assert(
      fc.property(worlds(method), (drawn) => {
        const world = { ...drawn, lookahead: 1, moves: drawn.moves.filter((one) => one.kind === 'commit') }
        let kept: readonly Individual[] = []
        const { births } = play(world, false)
        let commits = 0
        play(world, false, ({ machine, before }) => {
          const birth = births[commits++]!
          const newcomer = individualOf(1, commits, birth, scoreOf(birth.genome, world))
          kept = byParetoRank([...before, newcomer]).slice(0, world.population)
          expect(ids(machine.members()).toSorted()).toEqual(ids(kept).toSorted())
          expect(ids(machine.ranked())).toEqual(ids(byParetoRank(kept)))
        })
        if (world.objectives > 1) return
        const all = births.slice(0, commits).map((birth) => scoreOf(birth.genome, world)[0]!)
        const best = all.toSorted((a, b) => (a < b ? -1 : a > b ? 1 : 0)).slice(0, world.population)
        expect(kept.map((one) => one.score[0]!)).toEqual(best)
      }),
      runs,
    )
  })

  test('steady-state, replace: oldest, keeps the last to enter', () => {
    const method = methodNamed('steady-state')
    fc.assert(
      fc.property(worlds(method), (drawn) => {
        const moves = drawn.moves.filter((one) => one.kind === 'commit')
        const world = { ...drawn, lookahead: 1, settings: { ...drawn.settings, replace: 'oldest' }, moves }
        let commits = 0
        play(world, false, ({ machine }) => {
          commits++
          const numbers = machine.members().map((one) => one.id % 2 ** 40)
          const first = Math.max(1, commits - world.population + 1)
          expect(numbers).toEqual(Array.from({ length: numbers.length }, (_, k) => first + k))
        })
      }),
      runs,
    )
  })
})

test('one-plus-lambda: an equal mutant takes the place of its parent, the first of equals; a worse one does not', () => {
  const scores = [5, 5, 5, 6, 7, 4, 4]
  const started = drive({
    method: methodNamed('one-plus-lambda'),
    population: 2,
    lookahead: 2,
    variation,
    score: () => [scores.shift() ?? 9],
    seed: 1,
  })
  const parents = [1, 2, 2, 2].map((commits) => {
    started.steps(commits)
    return numberOf(started.machine.members()[0]!.id)
  })
  expect(parents).toEqual([1, 2, 2, 6])
})

test('every row of the table is complete, and its defaults lie within their bounds', () => {
  expect(new Set(methods.map((method) => method.name)).size).toBe(methods.length)
  for (const { summary, source, settings, defaultPopulation } of methods) {
    expect(summary.length).toBeGreaterThan(20)
    expect(source.length).toBeGreaterThan(10)
    expect(defaultPopulation).toBeGreaterThan(0)
    for (const row of Object.values(settings)) {
      expect(row.help.length).toBeGreaterThan(10)
      if (row.kind === 'choice') expect(row.options).toContain(row.default)
      else expect(row.default >= row.low && row.default <= row.high).toBe(true)
    }
  }
})
