// The agent process as the pool sees it. When it dies, nobody can tell which of its items did it: all that it had
// not answered become doubtful and are handed back; a new agent goes on with the rest.

import { check } from '../shared/check.js'
import type { Executor, WorkItem } from '../shared/result.js'
import type { AgentMessage, AgentOrder } from './agent.js'
import { Child, type Ending } from './child.js'
import { failedStartsMost } from './lane-process.js'
import type { Loss } from './lane-thread.js'
import type { ThreadsOptions } from './threads.js'
import { packBatch, type Simulated, unpackDone } from './wire.js'

export interface AgentLaneEvents {
  /** The first thread of the first agent can work. */
  ready(): void
  answered(item: WorkItem, simulated: Simulated, executor: Executor): void
  lost(loss: Loss, executor: Executor): void
  doubtful(item: WorkItem): void
  unusable(reason: string): void
  broken(promise: string): void
}

export class AgentLane {
  private readonly options: ThreadsOptions
  private readonly events: AgentLaneEvents
  /** Items the agent has and has not answered. */
  private readonly held = new Map<number, WorkItem>()
  private waiting: WorkItem[] = []
  private reportAt = 0
  private agent: Child<AgentOrder, AgentMessage> | undefined
  private isReady = false
  private nextSequence = 1
  private failedStarts = 0
  private closed = false

  constructor(options: ThreadsOptions, events: AgentLaneEvents) {
    this.options = options
    this.events = events
  }

  start(): void {
    this.isReady = false
    const agent = new Child<AgentOrder, AgentMessage>('worker/agent', undefined, {
      message: (message) => {
        if (agent === this.agent) this.hear(message)
      },
      gone: (ending) => {
        if (agent === this.agent) this.gone(ending)
      },
    })
    this.agent = agent
    agent.send({ start: this.options })
  }

  /**
   * Takes items; when one must avoid a thread of this agent, a new agent takes over first. Answers are gathered until
   * no more than `reportAt` items are without one, for half a second at most.
   */
  submit(items: readonly WorkItem[], reportAt: number): void {
    this.reportAt = reportAt
    const own = `${this.options.host}/${this.agent?.pid}`
    const isOwn = (worker: string) => worker === own || worker.startsWith(`${own}/`)
    if (items.some(({ avoid }) => avoid.some(isOwn))) this.replace()
    this.waiting.push(...items)
    this.forward()
  }

  async stop(): Promise<void> {
    this.closed = true
    this.agent?.end({ detail: 'closed' })
    await this.agent?.whenGone
  }

  private forward(): void {
    if (!this.isReady || this.waiting.length === 0 || this.closed) return
    const items = this.waiting
    this.waiting = []
    this.agent?.send({ items: packBatch(this.nextSequence, items), reportAt: this.reportAt })
    for (const item of items) this.held.set(this.nextSequence++, item)
  }

  private settle(sequence: number): WorkItem {
    const item = this.held.get(sequence)
    check(item !== undefined, 'an item of the agent is answered once')
    this.held.delete(sequence)
    return item
  }

  private hear(message: AgentMessage): void {
    if (this.closed) return
    if (message.kind === 'answers') {
      for (const { executor, sequences, done } of message.answers) {
        for (const [i, simulated] of unpackDone(done).entries()) {
          this.events.answered(this.settle(sequences[i]!), simulated, executor)
        }
      }
    } else if (message.kind === 'lost') {
      const { sequence, cause, detail, executor } = message
      this.events.lost({ item: this.settle(sequence), cause, detail }, executor)
    } else if (message.kind === 'doubtful') {
      this.events.doubtful(this.settle(message.sequence))
    } else if (message.kind === 'ready') {
      this.isReady = true
      this.failedStarts = 0
      this.events.ready()
      this.forward()
    } else if (message.kind === 'unusable') {
      this.closed = true
      this.agent?.end({ detail: message.reason })
      this.events.unusable(message.reason)
    } else {
      this.events.broken(message.promise)
    }
  }

  private gone(ending: Ending): void {
    if (this.closed) return
    if (!this.isReady && ++this.failedStarts >= failedStartsMost) {
      this.events.unusable(ending.detail)
      return
    }
    this.handBack()
    this.start()
  }

  private replace(): void {
    this.agent?.end({ detail: 'replaced by a fresh agent' })
    this.handBack()
    this.start()
  }

  private handBack(): void {
    const doubtful = [...this.held.values()]
    this.held.clear()
    for (const item of doubtful) this.events.doubtful(item)
  }
}
