// Promise: what is believed, given up, put right or looked at again is so once and for all, also after a restart. Here
// a test plays the workers by hand: who answers what, truly or not, and when the coordinator is started again.

import { describe, expect, it } from 'vitest'
import { setAsideWorker } from '../../coordinator/engine/confirmed.js'
import type { Engine } from '../../coordinator/engine/engine.js'
import { openEngine, replayRecord } from '../../coordinator/engine/recover.js'
import type { SearchPlan } from '../../coordinator/evolution/plan.js'
import { resultDigest } from '../../shared/digests.js'
import { genomeFromBytes } from '../../shared/encodings.js'
import type { DispatchFact, EvaluationResult, LossCause, WorkItem } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { fixtureTools, islandPlan, mixedPlan, simulated } from '../fixture.js'
import { Disk } from './disk.js'

interface Answer {
  readonly worker: string
  readonly result: EvaluationResult
}

/** One coordinator on one disk; the test is its dispatcher. */
class Desk {
  readonly disk = new Disk(stream(1, 'weather', 3))
  readonly plan: SearchPlan
  readonly #options: { readonly snapshotCommits: number; readonly stopAfter?: number }
  engine!: Engine
  replayed = 0

  constructor(plan: SearchPlan, options: { snapshotCommits?: number; stopAfter?: number } = {}) {
    this.plan = plan
    this.#options = { snapshotCommits: 1_000, ...options }
    this.start()
  }

  /** What was in memory is gone. */
  start(): void {
    const { engine, replay } = openEngine(fixtureTools(this.plan), this.disk, {
      leaseMs: Number.POSITIVE_INFINITY,
      ...this.#options,
    })
    this.engine = engine
    this.replayed = replay.commits
  }

  look(facts: readonly DispatchFact[] = []): void {
    this.engine.take(facts, 0)
    for (let rows = this.engine.rows(); rows; rows = this.engine.rows()) {
      this.disk.append(rows)
      this.engine.appended()
    }
  }

  work(count = 1_000): WorkItem[] {
    return this.engine.work(count, 0)
  }

  truth(item: WorkItem): EvaluationResult {
    const genome = genomeFromBytes(this.plan.problem.spec, item.genome)
    return simulated(this.plan, genome, item.firstReplicate, item.replicates)
  }

  honest(item: WorkItem): Answer {
    const worker = ['h1', 'h2', 'h3', 'h4'].find((name) => !item.avoid.includes(name))!
    return { worker, result: this.truth(item) }
  }

  /** A lie: worse than the truth by so much on both objectives. */
  false(item: WorkItem, worse: number): Answer {
    const { values } = this.truth(item)
    const [error, reach, height] = values
    return {
      worker: 'liar',
      result: { values: Float64Array.of(error! + worse, reach! - worse, height!), failures: [] },
    }
  }

  /** Answers everything handed out until nothing is left or `until` says so; answers not given are kept back. */
  run(answer: (item: WorkItem) => Answer | undefined, until: () => boolean = () => false): WorkItem[] {
    const keptBack: WorkItem[] = []
    this.look()
    for (let items = this.work(); items.length > 0 && !until(); items = this.work()) {
      for (const item of items) {
        const given = answer(item)
        if (given) this.look([factOf(item, given)])
        else keptBack.push(item)
      }
    }
    return keptBack
  }

  get kinds(): string[] {
    return [...this.disk.events()].map(({ kind }) => kind)
  }
}

function factOf(item: WorkItem, { worker, result }: Answer): DispatchFact {
  const executor = { kind: 'thread', worker, host: worker } as const
  return {
    kind: 'result',
    item,
    result,
    digest: resultDigest(result),
    executor,
    cpuSeconds: 1,
    wallSeconds: 1,
  }
}

function lossOf(item: WorkItem, cause: LossCause): DispatchFact {
  const executor = { kind: 'thread', worker: 'h1', host: 'h1' } as const
  return { kind: 'lost', item, cause, detail: 'gone', executor }
}

const single = (changes: Parameters<typeof islandPlan>[1], more: Partial<SearchPlan> = {}) => {
  const { migration: _, ...plan } = mixedPlan({
    islands: [islandPlan(1, changes)],
    controls: [],
    replicates: { first: 1, topUp: 0, most: 1, shared: true },
    confirm: { fraction: 0 },
    budget: { simulations: 60 },
    ...more,
  })
  return plan
}

describe('what was set aside', () => {
  /** Evaluation 2 kills whoever simulates it, while 1 is not answered yet. */
  function givenUp(): { desk: Desk; first: WorkItem; second: WorkItem } {
    const desk = new Desk(single({}))
    desk.look()
    const [first, second] = desk.work(2)
    let item = second!
    for (let tries = 0; desk.engine.counts.setAside === 0 && tries < 10; tries++) {
      desk.look([lossOf(item, 'died')])
      item = desk.work(1_000).find(({ evaluation }) => evaluation === 2) ?? item
    }
    expect(desk.engine.counts.setAside).toBe(1)
    return { desk, first: first!, second: second! }
  }

  it('stays so when a late result turns up, and nobody is blamed for it', () => {
    const { desk, first, second } = givenUp()
    desk.look([factOf(second, { worker: 'late', result: desk.truth(second) })])
    expect(desk.work().some(({ evaluation }) => evaluation === 2)).toBe(false)
    desk.look([factOf(second, { worker: 'later', result: desk.truth(second) })])
    desk.look([factOf(first, desk.honest(first))])
    desk.run((item) => desk.honest(item))
    expect(desk.disk.arrival(1, 2)!.worker).toBe(setAsideWorker)
    expect(desk.kinds).not.toContain('worker-shut-out')
  })
})

describe('what a convicted worker simulated', () => {
  /** Evaluations 2 and 3 are answered by a liar, too badly to be noticed; then it claims a would-be best with 5. */
  function convicted(method: string): Desk {
    const desk = new Desk(single({ method, population: 12, lookahead: 6 }))
    desk.run((item) => {
      if (item.purpose === 'confirm') return desk.honest(item)
      if (item.evaluation === 2 || item.evaluation === 3) return desk.false(item, 7)
      return item.evaluation === 5 ? desk.false(item, -7) : desk.honest(item)
    })
    expect(desk.kinds).toContain('worker-shut-out')
    return desk
  }

  for (const method of ['steady-state', 'generational', 'age-fitness-pareto', 'one-plus-lambda']) {
    it(`is looked at again where it is committed and alive, member or not yet (${method})`, () => {
      expect(convicted(method).engine.counts.corrections).toBeGreaterThan(0)
    })
  }

  it('is put right once, not again after every restart', () => {
    const desk = convicted('random-sampling')
    const before = desk.kinds.filter((kind) => kind === 'correction').length
    expect(before).toBeGreaterThan(0)
    for (let life = 0; life < 3; life++) {
      desk.start()
      desk.run((item) => desk.honest(item))
    }
    expect(desk.kinds.filter((kind) => kind === 'correction').length).toBe(before)
  })
})

describe('a disagreement', () => {
  it('is not forgotten by a crash', () => {
    // Evaluation 2 looks like a would-be best until 1 is in: its confirmation is asked for and contradicts it.
    const desk = new Desk(single({}))
    desk.look()
    const [first, second] = desk.work(2)
    const lie = desk.false(second!, 1)
    desk.look([factOf(second!, lie)])
    const confirm = desk.work().find(({ purpose }) => purpose === 'confirm')!
    desk.look([factOf(confirm, desk.honest(confirm))])
    expect(desk.engine.counts.disagreements).toBe(1)
    desk.start()
    desk.look()
    const best = { values: desk.truth(first!).values.fill(-9), failures: [] }
    best.values[1] = 9
    desk.run((item) => (item.evaluation === 1 ? { ...desk.honest(item), result: best } : desk.honest(item)))
    expect([...desk.disk.arrival(1, 2)!.result.values]).toEqual([...desk.truth(second!).values])
  })
})

describe('late answers', () => {
  it('of an earlier try make a later one needless: its loss is no reason to simulate again', () => {
    const desk = new Desk(single({}))
    desk.look()
    const [, second] = desk.work(2)
    desk.look([lossOf(second!, 'agent-lost')])
    const again = desk.work().find(({ evaluation }) => evaluation === 2)!
    expect(again.attempt).toBe(2)
    desk.look([factOf(second!, { worker: 'late', result: { ...desk.truth(second!) } })])
    desk.look([lossOf(again, 'agent-lost')])
    expect(
      desk.work().filter(({ evaluation, purpose }) => evaluation === 2 && purpose === 'evaluate'),
    ).toEqual([])
  })
})

describe('short lives', () => {
  it('derive a bounded number of commits again, however many there have been', () => {
    const desk = new Desk(single({ lookahead: 4 }, { budget: { simulations: 900 } }), { snapshotCommits: 40 })
    let most = 0
    for (let life = 0; life < 60; life++) {
      let answered = 0
      desk.run(
        (item) => (answered++ < 25 ? desk.honest(item) : undefined),
        () => answered >= 25,
      )
      desk.start()
      most = Math.max(most, desk.replayed)
    }
    expect(desk.engine.search.island(1).counters.commits).toBeGreaterThan(500)
    expect(most).toBeLessThan(100)
  })
})

describe('--stop-after', () => {
  for (const order of ['proposal', 'cost', 'arrival'] as const) {
    it(`comes to rest with order '${order}', whoever answers when`, () => {
      for (let slots = 1; slots <= 8; slots++) {
        const desk = new Desk(single({ order, lookahead: 6 }), { stopAfter: 20 })
        desk.look()
        for (let step = 0; step < 200 && desk.engine.status() === 'running'; step++) {
          for (const item of desk.work(slots)) desk.look([factOf(item, desk.honest(item))])
          desk.look()
        }
        expect(desk.engine.status(), `${slots} slots`).toBe('rested')
        expect(desk.engine.search.island(1).counters.committedSimulations).toBe(20)
      }
    })
  }
})

describe('a snapshot', () => {
  it('is of one moment, also when its island goes on before it is written', () => {
    const { controls: _, ...base } = mixedPlan()
    const plan = {
      ...base,
      controls: [],
      islands: [1, 2].map((island) => islandPlan(island, { lookahead: 6, population: 4 })),
      migration: { ...base.migration!, everyRounds: 1, topology: 'ring' as const },
      budget: { simulations: 300 },
    }
    // All results come in together: each island goes as far as the mail of the other lets it, wakes it, and is woken.
    const desk = new Desk(plan, { snapshotCommits: 3 })
    for (let round = 0; round < 40; round++) {
      desk.look()
      desk.look(desk.work().map((item) => factOf(item, desk.honest(item))))
      const again = replayRecord(fixtureTools(plan), desk.disk)
      expect(again.search.digest()).toEqual(desk.engine.search.digest())
      for (const island of again.search.islands) {
        const living = desk.engine.search.island(island.number)
        expect(island.outstanding().map(({ individual }) => individual.replicates)).toEqual(
          living.outstanding().map(({ individual }) => individual.replicates),
        )
      }
    }
    expect(desk.engine.search.island(2).counters.commits).toBeGreaterThan(40)
  })
})
