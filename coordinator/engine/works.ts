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
import type { Where } from './trust.js'
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
  /** What was simulated, the result that counts first; a process that says the same twice has one vote. */
  votes: Vote[]
  confirmed: boolean
  /** By another machine, or only by another process of the same. */
  confirmedBy: 'process' | 'host'
  /** Votes differ and it is not settled: nothing is committed meanwhile. */
  disputed: boolean
  /** Classes of processors on which another simulation would tell most. */
  onProcessors: readonly string[]
  /** Asked for again because whoever simulated it is not believed any more. */
  suspect: boolean
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
  /** The newest try that is under way. */
  attempt: number
  /** An older one that is still under way beside it: the newest is a hedge. 0: none. */
  earlier: number
  /** Tries so far. */
  tries: number
  sinceMs: number
  leaseEndsMs: number
  /** Not handed out before: nobody who fits took it. */
  notBeforeMs: number
  refusals: number
  /** Was sent a second time already. */
  hedged: boolean
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
    confirmedBy: 'process',
    disputed: false,
    onProcessors: [],
    suspect: false,
    recorded: undefined,
    spotCheck: undefined,
    clearedAt: -1,
    evaluate: newLane(),
    confirm: newLane(),
    sharedDeaths: 0,
    aloneDeaths: 0,
  }
}

function newLane(): Lane {
  return {
    state: 'idle',
    attempt: 0,
    earlier: 0,
    tries: 0,
    sinceMs: 0,
    leaseEndsMs: Number.POSITIVE_INFINITY,
    notBeforeMs: 0,
    refusals: 0,
    hedged: false,
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
  readonly #hedges: { readonly work: Work; readonly purpose: Purpose }[] = []
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
    lane.earlier = 0
    lane.hedged = false
    lane.leaseEndsMs = Number.POSITIVE_INFINITY
  }

  /** Submits once more what is under way, to somebody else, before everything that waits. */
  hedge(work: Work, purpose: Purpose): void {
    work[purpose].hedged = true
    this.#hedges.push({ work, purpose })
  }

  /** Nobody who fits took it: it is handed out again later, and later each time. */
  putOff(work: Work, purpose: Purpose, nowMs: number): void {
    const lane = work[purpose]
    if (lane.refusals > 0)
      lane.notBeforeMs = nowMs + Math.min(putOffMostMs, 50 * (1 << Math.min(lane.refusals - 1, 10)))
    lane.refusals++
  }

  /** One of two tries under way is lost; false when the lost one was the only one. */
  dropTry(work: Work, purpose: Purpose, attempt: number): boolean {
    const lane = work[purpose]
    if (lane.state !== 'submitted' || lane.earlier === 0) return false
    if (attempt === lane.attempt) lane.attempt = lane.earlier
    lane.earlier = 0
    return true
  }

  /** The next items to submit, at most `count`; `whereOf` says where, or that one is held back. */
  take(count: number, nowMs: number, leaseMs: number, whereOf: WhereOf): WorkItem[] {
    const items = this.#takeHedges(nowMs, leaseMs, whereOf)
    for (const purpose of ['confirm', 'evaluate'] as const) {
      const queue = purpose === 'confirm' ? this.#confirmQueue : this.#evaluateQueue
      const held: Work[] = []
      while (items.length < count) {
        const work = queue.shift()
        if (!work) break
        const lane = work[purpose]
        if (lane.state !== 'waiting' || this.find(work.island, work.evaluation) !== work) continue
        if (!isNeeded(work, purpose)) {
          lane.state = 'idle'
          continue
        }
        const where = lane.notBeforeMs > nowMs ? undefined : whereOf(work, purpose)
        if (!where) {
          held.push(work)
          continue
        }
        lane.state = 'submitted'
        lane.attempt = ++lane.tries
        lane.sinceMs = nowMs
        lane.leaseEndsMs = nowMs + leaseMs
        this.#submitted++
        items.push(itemOf(work, purpose, lane.attempt, where))
      }
      queue.putBack(held)
    }
    return items
  }

  #takeHedges(nowMs: number, leaseMs: number, whereOf: WhereOf): WorkItem[] {
    return this.#hedges.splice(0).flatMap(({ work, purpose }) => {
      const lane = work[purpose]
      const isUnderWay = lane.state === 'submitted' && lane.earlier === 0
      if (!isUnderWay || this.find(work.island, work.evaluation) !== work) return []
      const where = whereOf(work, purpose)
      if (!where) return []
      lane.earlier = lane.attempt
      lane.attempt = ++lane.tries
      lane.leaseEndsMs = nowMs + leaseMs
      return [{ ...itemOf(work, purpose, lane.attempt, where), hedge: true as const }]
    })
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

/** Longest wait before work that was handed back is handed out again. */
const putOffMostMs = 5_000

/** Where an item may be simulated; undefined while it is held back. */
export type WhereOf = (work: Work, purpose: Purpose) => Where | undefined

function itemOf(work: Work, purpose: Purpose, attempt: number, where: Where): WorkItem {
  const item = {
    island: work.island,
    evaluation: work.evaluation,
    individual: work.individual,
    firstReplicate: work.firstReplicate,
    replicates: work.replicates,
    genome: work.genome,
    expectedCost: work.expectedCost,
    attempt,
    purpose,
    isolation: work.sharedDeaths >= limits.attemptsBeforeIsolation ? ('alone' as const) : ('shared' as const),
    avoid: where.avoid,
  }
  const { avoidHosts, onProcessor } = where
  if (avoidHosts === undefined && onProcessor === undefined) return item
  return {
    ...item,
    ...(avoidHosts === undefined ? {} : { avoidHosts }),
    ...(onProcessor === undefined ? {} : { onProcessor }),
  }
}

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
