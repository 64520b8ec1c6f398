// The code of the process that holds the simulating threads. It runs no plug-in on its own event loop, so it always
// hears its parent; when the channel closes it ends, threads and all.
//
// Why a process of its own: V8 ends the whole process when one thread asks for a single piece of memory beyond its
// limit, and so does a crash in native code. Here that costs an agent, never the coordinator.

import { check } from '../shared/check.js'
import type { Executor, LossCause, WorkItem } from '../shared/result.js'
import { leaveWithFolder } from './leave.js'
import { Threads, type ThreadsOptions } from './threads.js'
import { spareHelpersOfAgent } from './thrift.js'
import {
  type BatchMessage,
  batchLength,
  type DoneMessage,
  packDone,
  type Simulated,
  unpackItem,
} from './wire.js'

/**
 * What the parent says: options once, then items; item i of a batch has the sequence number batch + i. Answers are held
 * back until no more than `reportAt` items are without one, or for `holdMs`.
 */
export type AgentOrder =
  | { readonly start: ThreadsOptions }
  | { readonly items: BatchMessage; readonly reportAt: number }

export type AgentMessage =
  | { readonly kind: 'ready' }
  | { readonly kind: 'unusable'; readonly reason: string }
  | { readonly kind: 'broken'; readonly promise: string }
  | { readonly kind: 'answers'; readonly answers: readonly Answers[] }
  | {
      readonly kind: 'lost'
      readonly executor: Executor
      readonly sequence: number
      readonly cause: LossCause
      readonly detail: string
    }
  | { readonly kind: 'doubtful'; readonly sequence: number }

/** Results of one thread; result i is that of the item numbered sequences[i]. */
export interface Answers {
  readonly executor: Executor
  readonly sequences: Float64Array
  readonly done: DoneMessage
}

interface Answer {
  readonly sequence: number
  readonly simulated: Simulated
}

/** The longest that an answer waits for others. */
const holdMs = 500

let threads: Threads | undefined
let reportAt = 0
let holding: NodeJS.Timeout | undefined
let isFlushing = false
const sequences = new Map<WorkItem, number>()
const answers = new Map<Executor, Answer[]>()

spareHelpersOfAgent()
process.on('disconnect', leaveWithFolder)
process.on('message', (order: AgentOrder) => {
  if ('start' in order) start(order.start)
  else submit(order.items, order.reportAt)
})

function start(options: ThreadsOptions): void {
  threads = new Threads(options, {
    ready: () => say({ kind: 'ready' }),
    answered: (item, simulated, executor) => keep(executor, { sequence: settle(item), simulated }),
    lost: ({ item, cause, detail }, executor) =>
      say({ kind: 'lost', executor, sequence: settle(item), cause, detail }),
    doubtful: (item) => say({ kind: 'doubtful', sequence: settle(item) }),
    unusable: (reason) => say({ kind: 'unusable', reason }),
    broken: (promise) => say({ kind: 'broken', promise }),
  })
}

function submit(message: BatchMessage, least: number): void {
  check(threads !== undefined, 'items come after the options')
  reportAt = least
  const items = Array.from({ length: batchLength(message) }, (_, i) => unpackItem(message, i))
  for (const [i, item] of items.entries()) sequences.set(item, message.batch + i)
  threads.submit(items)
}

/** The item has its answer: its number, for the last time. */
function settle(item: WorkItem): number {
  const sequence = sequences.get(item)
  check(sequence !== undefined, 'an item is answered once')
  sequences.delete(item)
  return sequence
}

/**
 * Answers travel together: a message between processes costs as much CPU as a small simulation, and whoever waits for
 * them makes them durable together.
 */
function keep(executor: Executor, answer: Answer): void {
  holding ??= setTimeout(flush, holdMs)
  const list = answers.get(executor)
  if (list !== undefined) list.push(answer)
  else answers.set(executor, [answer])
  // The other answers of the same message of a thread are still to come.
  if (sequences.size <= reportAt && !isFlushing) {
    isFlushing = true
    queueMicrotask(flush)
  }
}

function flush(): void {
  clearTimeout(holding)
  holding = undefined
  isFlushing = false
  const list = Array.from(answers, ([executor, own]) => ({
    executor,
    sequences: Float64Array.from(own, ({ sequence }) => sequence),
    done: packDone(
      0,
      0,
      own.map(({ simulated }) => simulated),
    ),
  }))
  answers.clear()
  if (list.length > 0) say({ kind: 'answers', answers: list })
}

function say(message: AgentMessage): void {
  if (process.connected) process.send?.(message)
}
