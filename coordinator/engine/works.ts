// The pieces of work in hand: every outstanding evaluation of every island, and every second simulation that was
// asked for. The coordinator owns retries, deadlines and blame; a dispatcher only carries.
//
//   waiting --work()--> submitted --result--> arrived --gate--> (committed: forgotten)
//      ^                   |
//      +------- lost ------+--(died too often)--> set aside: arrived as failed
//
// Losing an agent or a lease never counts against an evaluation. Deaths in a shared process count until it runs
// alone; only deaths there can have it set aside.

import { check } from '../../shared/check.js'
import { idOf } from '../../shared/ids.js'
import { limits } from '../../shared/limits.js'
import type { DispatchFact, LossCause, WorkItem } from '../../shared/result.js'
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
  /** Chosen by hash for a second simulation; undefined until asked. */
  spotCheck: boolean | undefined
  /** Lanes: the first simulation, and a second one for confirmation. */
  readonly lanes: { readonly evaluate: Lane; readonly confirm: Lane }
  sharedDeaths: number
  aloneDeaths: number
}

export interface Lane {
  state: 'idle' | 'waiting' | 'submitted'
  attempt: number
  leaseEndsMs: number
}

export type Purpose = WorkItem['purpose']

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
export function newWork(
  from: Omit<Work, 'votes' | 'confirmed' | 'recorded' | 'spotCheck' | 'lanes' | 'sharedDeaths' | 'aloneDeaths'>,
): Work {
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
    lanes: { evaluate: newLane(), confirm: newLane() },
    sharedDeaths: 0,
    aloneDeaths: 0,
  }
}

function newLane(): Lane {
  return { state: 'idle', attempt: 0, leaseEndsMs: Infinity }
}

/** Counts a loss and says what follows. */
export function blame(work: Work, cause: LossCause, isolation: WorkItem['isolation']): LossVerdict {
  if (!countsAsDeath[cause]) return 'again'
  if (isolation === 'shared') work.sharedDeaths++
  else work.aloneDeaths++
  return work.aloneDeaths >= limits.attemptsAlone ? 'set-aside' : 'again'
}

export function isolationOf(work: Work): WorkItem['isolation'] {
  return work.sharedDeaths >= limits.attemptsBeforeIsolation ? 'alone' : 'shared'
}

/** All work in hand, with two queues: confirmations first, because islands wait for them; then by proposal. */
export class Works {
  readonly #works = new Map<number, Work>()
  readonly #confirmQueue = new Queue()
  readonly #evaluateQueue = new Queue()
  #submitted = 0

  get size(): number {
    return this.#works.size
  }
  get submitted(): number {
    return this.#submitted
  }
  get waiting(): number {
    return this.#confirmQueue.size + this.#evaluateQueue.size
  }

  find(island: number, evaluation: number): Work | undefined {
    return this.#works.get(idOf(island, evaluation))
  }
  all(): IterableIterator<Work> {
    return this.#works.values()
  }

  add(work: Work): void {
    const key = idOf(work.island, work.evaluation)
    check(!this.#works.has(key), 'an evaluation is in hand once')
    this.#works.set(key, work)
  }

  forget(work: Work): void {
    for (const purpose of purposes) this.#leave(work.lanes[purpose])
    this.#works.delete(idOf(work.island, work.evaluation))
  }

  /** Puts a lane of the work in its queue, unless it is there or under way. */
  want(work: Work, purpose: Purpose): void {
    const lane = work.lanes[purpose]
    if (lane.state !== 'idle') return
    lane.state = 'waiting'
    const queue = purpose === 'confirm' ? this.#confirmQueue : this.#evaluateQueue
    queue.push(work)
  }

  /** The answer to a submitted lane is in, or it is given up. */
  settle(work: Work, purpose: Purpose): void {
    this.#leave(work.lanes[purpose])
  }

  #leave(lane: Lane): void {
    if (lane.state === 'submitted') this.#submitted--
    lane.state = 'idle'
    lane.leaseEndsMs = Infinity
  }

  /** The next items to submit, at most `count`; `allowed` may hold evaluations back. */
  take(count: number, leaseEndsMs: number, allowed: (work: Work) => boolean, shutOut: ReadonlySet<string>): WorkItem[] {
    const items: WorkItem[] = []
    for (const purpose of purposes) {
      const queue = purpose === 'confirm' ? this.#confirmQueue : this.#evaluateQueue
      const held: Work[] = []
      while (items.length < count) {
        const work = queue.shift()
        if (!work) break
        const lane = work.lanes[purpose]
        const isCurrent = lane.state === 'waiting' && this.#works.get(idOf(work.island, work.evaluation)) === work
        if (!isCurrent) continue
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
    for (const work of this.#works.values()) {
      for (const purpose of purposes) {
        const lane = work.lanes[purpose]
        if (lane.state === 'submitted' && lane.leaseEndsMs <= nowMs) late.push({ work, purpose })
      }
    }
    return late
  }
}

const purposes = ['confirm', 'evaluate'] as const

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
    isolation: isolationOf(work),
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

/** True when the fact answers a try that is not the present one: it may still carry a good result. */
export function isStale(work: Work, fact: DispatchFact): boolean {
  return work.lanes[fact.item.purpose].attempt !== fact.item.attempt
}
