// The queue server as the agent sees it: every call ends in time, whatever the server or the library does, and says
// whether it was done. A server that moved (a coordinator started again on another node) is followed.
//
// `epoch` counts the servers: a lease taken from an earlier one means nothing.

import { Refusal, refuse } from '../../shared/refusals.js'
import type { AgentQueue } from './port.js'

/** Where the queue server is. A fixed address, or a file that says it (skerry work --record). */
export interface QueueLocation {
  /** The address now; refuses when nobody has said one. Called at the start, at each heartbeat, and often while nothing answers. */
  current(): Promise<string>
}

export function fixedLocation(url: string): QueueLocation {
  return { current: async () => url }
}

export interface ServerOptions {
  readonly location: QueueLocation
  /** A queue of this address, not yet open. Refuses when the address cannot be read. */
  readonly createQueue: (url: string) => AgentQueue
  /** Backstop of one call: the queue itself should give up earlier. */
  readonly callMs: number
  /** It can be reached again, or no more; `why` in the latter case. */
  readonly changed: (connected: boolean, why: string) => void
  /** Trying again cannot help: access was withdrawn. */
  readonly fatal: (refusal: Refusal) => void
  readonly moved: (url: string) => void
}

export type Outcome<Value> =
  | { readonly done: true; readonly value: Value }
  | { readonly done: false; readonly fault: Refusal }

/** Answers in a row that forbid us something before we believe that it will stay so. */
const forbiddenMost = 3

export class Server {
  epoch = 0
  connected = false
  private readonly options: ServerOptions
  private queue: AgentQueue | undefined
  private url: string | undefined
  private forbidden = 0
  private moving: Promise<void> | undefined

  constructor(options: ServerOptions) {
    this.options = options
  }

  /** One attempt to connect. @throws Refusal */
  async open(): Promise<void> {
    const url = await this.options.location.current()
    const queue = this.options.createQueue(url)
    try {
      await within(queue.open(), 2 * this.options.callMs)
    } catch (fault) {
      await closed(queue)
      throw asRefusal(fault)
    }
    this.queue = queue
    this.url = url
    this.epoch++
    this.note(true, '')
  }

  /**
   * Asks the server something. When the time is over the call may still be done later: `late` then gets its value, so
   * that nothing is taken and forgotten.
   */
  async ask<Value>(
    call: (queue: AgentQueue) => Promise<Value>,
    late?: (value: Value) => void,
    limitMs = this.options.callMs,
  ): Promise<Outcome<Value>> {
    const { queue } = this
    if (queue === undefined)
      return { done: false, fault: refuse('queue-unreachable', { detail: 'it has not answered yet' }) }
    try {
      const value = await within(call(queue), limitMs, late)
      if (queue === this.queue) this.answered()
      return { done: true, value }
    } catch (error) {
      const fault = asRefusal(error)
      if (queue === this.queue) this.failed(fault)
      return { done: false, fault }
    }
  }

  /** Waits for work, at most so long; true when there is a sign of some. Never faster while nothing answers. */
  async waitForWork(searches: readonly string[], waitMs: number): Promise<boolean> {
    const { queue } = this
    const startMs = performance.now()
    try {
      if (queue !== undefined && this.connected)
        return await within(queue.waitForWork(searches, waitMs), waitMs + this.options.callMs)
    } catch {
      // As if there had been no sign.
    }
    await pause(Math.max(0, waitMs - (performance.now() - startMs)))
    return false
  }

  /** Looks whether the server is where it was, and goes after it. Never throws. */
  follow(): Promise<void> {
    this.moving ??= this.followOnce().finally(() => {
      this.moving = undefined
    })
    return this.moving
  }

  async close(): Promise<void> {
    const { queue } = this
    this.queue = undefined
    this.connected = false
    if (queue !== undefined) await closed(queue)
  }

  private async followOnce(): Promise<void> {
    if (this.queue === undefined) return
    try {
      const url = await this.options.location.current()
      if (url === this.url || this.queue === undefined) return
      const queue = this.options.createQueue(url)
      try {
        await within(queue.open(), 2 * this.options.callMs)
      } catch (fault) {
        await closed(queue)
        throw fault
      }
      const before: AgentQueue | undefined = this.queue
      this.queue = queue
      this.url = url
      this.epoch++
      this.forbidden = 0
      this.options.moved(url)
      this.note(true, '')
      if (before !== undefined) await closed(before)
    } catch {
      // Nobody is there yet; the next heartbeat looks again.
    }
  }

  private answered(): void {
    this.forbidden = 0
    this.note(true, '')
  }

  private failed(fault: Refusal): void {
    if (fault.code === 'queue-unreachable') {
      this.note(false, fault.detail)
      return
    }
    if (fault.code !== 'queue-access' && fault.code !== 'queue-tls') return
    this.forbidden++
    if (this.forbidden >= forbiddenMost) this.options.fatal(fault)
  }

  private note(connected: boolean, why: string): void {
    if (connected === this.connected) return
    this.connected = connected
    this.options.changed(connected, why)
  }
}

async function closed(queue: AgentQueue): Promise<void> {
  try {
    await within(queue.close(), 500)
  } catch {
    // It is given up either way.
  }
}

function asRefusal(fault: unknown): Refusal {
  if (fault instanceof Refusal) return fault
  const detail = fault instanceof Error ? fault.message : String(fault)
  return refuse('queue-unreachable', { detail, cause: fault })
}

/** The promise, or a refusal when it takes longer; its value then goes to `late`. */
export function within<Value>(
  promise: Promise<Value>,
  limitMs: number,
  late?: (value: Value) => void,
): Promise<Value> {
  return new Promise((resolve, reject) => {
    let over = false
    const timer = setTimeout(() => {
      over = true
      reject(
        refuse('queue-unreachable', {
          detail: `no answer within ${Number((limitMs / 1000).toPrecision(2))} s`,
        }),
      )
    }, limitMs)
    promise.then(
      (value) => {
        clearTimeout(timer)
        if (over) late?.(value)
        else resolve(value)
      },
      (error: unknown) => {
        clearTimeout(timer)
        if (!over) reject(error)
      },
    )
  })
}

export function pause(ms: number): Promise<void> {
  return new Promise((resolve) => {
    setTimeout(resolve, ms)
  })
}
