// The pieces of work in hand: every outstanding evaluation of every island, and every second simulation that was
// asked for. The coordinator owns retries, deadlines and blame; a dispatcher only carries.
//
//   waiting --take()--> submitted --result--> (answered) --gate--> committed: forgotten
//      ^                   |
//      +------- lost ------+--(died too often)--> set aside: answered as failed
//
// Losing an agent or a lease never counts against an evaluation. Deaths in a shared process count until it runs
// alone; only deaths there can have it set aside.

import { check } from '../../shared/check.js'
import { limits } from '../../shared/limits.js'
import type { LossCause, WorkItem } from '../../shared/result.js'
import type { Vote } from './votes.js'

export interface Work {
  readonly island: number
  readonly evaluation: number
  readonly individual: number
  readonly firstReplicate: number
  readonly replicates: number
  readonly simulations: number
  readonly expectedCost: number
  readonly genome: Uint8Array
  /** 'again': committed already, simulated once more because somebody is under suspicion or about to leave. */
  readonly kind: 'first' | 'again'
  /** One vote a worker. */
  votes: Vote[]
  confirmed: boolean
  /** The vote whose result stands in the record: what a replay would commit. */
  recorded: Vote | undefined
  /** Must be simulated a second time whatever it gave; undefined until asked. */
  spotCheck: boolean | undefined
  /** Version of the island's best scores at which the result was no would-be best; -1 while nobody asked. */
  clearedAt: number
  /** The first simulation, and further ones for confirmation. */
  readonly evaluate: Lane
  readonly confirm: Lane
  sharedDeaths: number
  aloneDeaths: number
}

export interface Lane {
  state: 'idle' | 'waiting' | 'submitted'
  attempt: number
  leaseEndsMs: number
}

export type Purpose = WorkItem['purpose']
export type WorkDescription = Pick<
  Work,
  | 'island'
  | 'evaluation'
  | 'individual'
  | 'firstReplicate'
  | 'replicates'
  | 'simulations'
  | 'expectedCost'
  | 'genome'
  | 'kind'
>

/** What a loss means for its evaluation. */
export type LossVerdict = 'again' | 'set-aside'

const countsAsDeath: Record<LossCause, boolean> = {
  died: true,
  'time-limit': true,
  memory: true,
  'agent-lost': false,
  'handed-back': false,
}

/** A piece of work nobody has begun. */
export function newWork(from: WorkDescription): Work {
  // Spelt out, not spread: one is made for every evaluation, and a spread costs ten times as much.
  return {
    island: from.island,
    evaluation: from.evaluation,
    individual: from.individual,
    firstReplicate: from.firstReplicate,
    replicates: from.replicates,
    simulations: from.simulations,
    expectedCost: from.expectedCost,
    genome: from.genome,
    kind: from.kind,
    votes: [],
    confirmed: false,
    recorded: undefined,
    spotCheck: undefined,
    clearedAt: -1,
    evaluate: { state: 'idle', attempt: 0, leaseEndsMs: Number.POSITIVE_INFINITY },
    confirm: { state: 'idle', attempt: 0, leaseEndsMs: Number.POSITIVE_INFINITY },
    sharedDeaths: 0,
    aloneDeaths: 0,
  }
}

/** False when a lane's answer would tell nothing new: a late one of an earlier try has come in meanwhile. */
export function isNeeded(work: Work, purpose: Purpose): boolean {
  return purpose === 'evaluate' ? work.votes.length === 0 : !work.confirmed
}

/** Counts a loss and says what follows. */
export function blame(work: Work, cause: LossCause, isolation: WorkItem['isolation']): LossVerdict {
  if (!countsAsDeath[cause]) return 'again'
  if (isolation === 'shared') work.sharedDeaths++
  else work.aloneDeaths++
  return work.aloneDeaths >= limits.attemptsAlone ? 'set-aside' : 'again'
}

/** All work in hand, with two queues: confirmations first, because islands wait for them; then by proposal. */
export class Works {
  // Keyed by two small numbers: one large key would be a heap number, and slow to look up.
  readonly #byIsland = new Map<number, Map<number, Work>>()
  readonly #confirmQueue = new Queue()
  readonly #evaluateQueue = new Queue()
  #submitted = 0

  get submitted(): number {
    return this.#submitted
  }
  get waiting(): number {
    return this.#confirmQueue.size + this.#evaluateQueue.size
  }

  find(island: number, evaluation: number): Work | undefined {
    return this.#byIsland.get(island)?.get(evaluation)
  }
  *all(): Iterable<Work> {
    for (const works of this.#byIsland.values()) yield* works.values()
  }
  of(island: number): Work[] {
    return [...(this.#byIsland.get(island)?.values() ?? [])]
  }

  add(work: Work): void {
    const works = this.#byIsland.get(work.island) ?? new Map<number, Work>()
    this.#byIsland.set(work.island, works)
    check(!works.has(work.evaluation), 'an evaluation is in hand once')
    works.set(work.evaluation, work)
  }

  forget(work: Work): void {
    this.settle(work, 'evaluate')
    this.settle(work, 'confirm')
    this.#byIsland.get(work.island)?.delete(work.evaluation)
  }

  /** Puts a lane of the work in its queue, unless it is there or under way. */
  want(work: Work, purpose: Purpose): void {
    const lane = work[purpose]
    if (lane.state !== 'idle') return
    lane.state = 'waiting'
    if (purpose === 'confirm') this.#confirmQueue.push(work)
    else this.#evaluateQueue.push(work)
  }

  /** The answer to a submitted lane is in, or it is given up. */
  settle(work: Work, purpose: Purpose): void {
    const lane = work[purpose]
    if (lane.state === 'submitted') this.#submitted--
    lane.state = 'idle'
    lane.leaseEndsMs = Number.POSITIVE_INFINITY
  }

  /** The next items to submit, at most `count`; `allowed` may hold evaluations back. */
  take(
    count: number,
    leaseEndsMs: number,
    allowed: (work: Work) => boolean,
    shutOut: ReadonlySet<string>,
  ): WorkItem[] {
    const items: WorkItem[] = []
    for (const purpose of ['confirm', 'evaluate'] as const) {
      const queue = purpose === 'confirm' ? this.#confirmQueue : this.#evaluateQueue
      const held: Work[] = []
      while (items.length < count) {
        const work = queue.shift()
        if (!work) break
        const lane = work[purpose]
        if (lane.state !== 'waiting' || this.find(work.island, work.evaluation) !== work) continue
        if (!allowed(work)) {
          held.push(work)
          continue
        }
        lane.state = 'submitted'
        lane.attempt++
        lane.leaseEndsMs = leaseEndsMs
        this.#submitted++
        items.push(itemOf(work, purpose, lane.attempt, shutOut))
      }
      queue.putBack(held)
    }
    return items
  }

  /** Submitted lanes whose lease has run out. */
  overdue(nowMs: number): { readonly work: Work; readonly purpose: Purpose }[] {
    const late: { readonly work: Work; readonly purpose: Purpose }[] = []
    for (const work of this.all()) {
      if (work.evaluate.leaseEndsMs <= nowMs) late.push({ work, purpose: 'evaluate' })
      if (work.confirm.leaseEndsMs <= nowMs) late.push({ work, purpose: 'confirm' })
    }
    return late
  }
}

function itemOf(work: Work, purpose: Purpose, attempt: number, shutOut: ReadonlySet<string>): WorkItem {
  return {
    island: work.island,
    evaluation: work.evaluation,
    individual: work.individual,
    firstReplicate: work.firstReplicate,
    replicates: work.replicates,
    genome: work.genome,
    expectedCost: work.expectedCost,
    attempt,
    purpose,
    isolation: work.sharedDeaths >= limits.attemptsBeforeIsolation ? 'alone' : 'shared',
    avoid:
      work.votes.length === 0 && shutOut.size === 0
        ? nobody
        : [...work.votes.map((vote) => vote.executor.worker), ...shutOut],
  }
}

const nobody: readonly string[] = []

/** First in, first out, without moving what stays. */
class Queue {
  #items: Work[] = []
  #head = 0

  get size(): number {
    return this.#items.length - this.#head
  }
  push(work: Work): void {
    this.#items.push(work)
  }
  shift(): Work | undefined {
    const work = this.#items[this.#head]
    if (work === undefined) return undefined
    this.#head++
    if (this.#head > 1024 && this.#head * 2 > this.#items.length) {
      this.#items = this.#items.slice(this.#head)
      this.#head = 0
    }
    return work
  }
  putBack(works: readonly Work[]): void {
    if (works.length === 0) return
    this.#items = [...works, ...this.#items.slice(this.#head)]
    this.#head = 0
  }
}
