// A queue server in memory, on a virtual clock, that can be emptied, put back to an earlier state, frozen and cut off;
// and agents that take from it as they are told. For tests of the dispatcher's own logic.

import type { Clock } from '../../../coordinator/dispatch/redis/clock.js'
import type {
  CoordinatorQueue,
  Delivery,
  JobState,
  OutgoingJob,
} from '../../../coordinator/dispatch/redis/port.js'
import { type Answers, contentWord, decodeJob, encodeJob, type Job } from '../../../shared/cluster/codec.js'
import { type Announcement, type Heartbeat, protocolVersion } from '../../../shared/cluster/messages.js'
import { resultDigest } from '../../../shared/digests.js'
import { refuse } from '../../../shared/refusals.js'
import type { WorkItem } from '../../../shared/result.js'

/** Timers that fire only when the test lets time pass. */
export class VirtualClock implements Clock {
  #nowMs = 1000
  #next = 0
  readonly #timers = new Map<number, { readonly atMs: number; readonly call: () => void }>()

  nowMs(): number {
    return this.#nowMs
  }
  after(ms: number, call: () => void): () => void {
    const id = this.#next++
    this.#timers.set(id, { atMs: this.#nowMs + ms, call })
    return () => this.#timers.delete(id)
  }

  /** Lets so much time pass, and everything happen that is due meanwhile, in order. */
  async pass(ms: number): Promise<void> {
    const endMs = this.#nowMs + ms
    for (;;) {
      await settle()
      const [id, timer] = [...this.#timers].sort(([a, x], [b, y]) => x.atMs - y.atMs || a - b)[0] ?? []
      if (id === undefined || !timer || timer.atMs > endMs) break
      this.#timers.delete(id)
      this.#nowMs = Math.max(this.#nowMs, timer.atMs)
      timer.call()
    }
    this.#nowMs = endMs
    await settle()
  }

  /** The process is stopped: time goes on, nothing happens. */
  skip(ms: number): void {
    this.#nowMs += ms
  }
}

/** Lets every promise that can go on do so. */
async function settle(): Promise<void> {
  for (let i = 0; i < 5; i++) await new Promise((resolve) => setImmediate(resolve))
}

export interface State {
  instance: string | undefined
  plugin: Uint8Array | undefined
  announcements: Map<string, Announcement>
  /** Jobs as bytes, by queue; the front is taken first. */
  queues: Map<string, Uint8Array[]>
  /** Taken and not finished. */
  active: Map<number, string>
  results: { receipt: string; answers: Answers | undefined }[]
  agents: Map<string, Heartbeat>
}

const emptyState = (): State => ({
  instance: undefined,
  plugin: undefined,
  announcements: new Map(),
  queues: new Map(),
  active: new Map(),
  results: [],
  agents: new Map(),
})

export class MemoryQueue implements CoordinatorQueue {
  state = emptyState()
  /** Commands are refused, as by a client that has noticed. */
  cutOff = false
  closed = false
  acknowledged: string[] = []
  readonly #clock: VirtualClock
  readonly #search: string
  readonly #read = new Set<string>()
  #receipts = 0

  constructor(clock: VirtualClock, search: string) {
    this.#clock = clock
    this.#search = search
  }

  /** Emptied, as by a restart without a saved file. */
  flush(): void {
    this.state = emptyState()
    this.#read.clear()
  }
  snapshot(): State {
    return structuredClone(this.state)
  }

  /** An agent's way in. */
  deliver(answers: Answers | undefined): string {
    const receipt = `${++this.#receipts}-0`
    this.state.results.push({ receipt, answers })
    return receipt
  }
  takeJob(agent: string): Job | undefined {
    for (const name of [`to-${agent}`, 'work']) {
      const bytes = this.state.queues.get(name)?.shift()
      if (!bytes) continue
      const job = decodeJob(bytes)
      this.state.active.set(job.header.dispatch, name)
      return job
    }
    return undefined
  }
  handBack(job: Job): void {
    this.#queue('work').unshift(encodeJob(job))
    this.state.active.delete(job.header.dispatch)
  }
  waiting(name = 'work'): Job[] {
    return (this.state.queues.get(name) ?? []).map(decodeJob)
  }

  #check(): void {
    if (this.cutOff) throw refuse('queue-unreachable', { detail: 'memory: nothing listens there' })
  }
  #queue(name: string): Uint8Array[] {
    const known = this.state.queues.get(name) ?? []
    this.state.queues.set(name, known)
    return known
  }

  async open(): Promise<void> {
    this.#check()
  }
  async announce(announcement: Announcement): Promise<void> {
    this.#check()
    this.state.announcements.set(announcement.search, structuredClone(announcement))
  }
  async announced(search: string): Promise<Announcement | undefined> {
    this.#check()
    return this.state.announcements.get(search)
  }
  async putPlugin(bytes: Uint8Array): Promise<void> {
    this.#check()
    this.state.plugin = bytes
  }
  async instance(): Promise<string | undefined> {
    this.#check()
    return this.state.instance
  }
  async begin(instance: string): Promise<void> {
    this.#check()
    this.state.queues.clear()
    this.state.active.clear()
    this.state.instance = instance
    this.#read.clear()
  }
  async add(jobs: readonly OutgoingJob[]): Promise<void> {
    this.#check()
    const queueFor = (agent: string | undefined) => this.#queue(agent === undefined ? 'work' : `to-${agent}`)
    for (const { job, agent, urgent } of jobs) if (!urgent) queueFor(agent).push(encodeJob(job))
    // The last one put first goes first: in their own order, as the real queue has them.
    for (const { job, agent, urgent } of jobs.toReversed())
      if (urgent) queueFor(agent).unshift(encodeJob(job))
  }
  async remove(jobs: readonly { readonly dispatch: number }[]): Promise<void> {
    this.#check()
    const gone = new Set(jobs.map(({ dispatch }) => dispatch))
    for (const [name, queue] of this.state.queues) {
      this.state.queues.set(
        name,
        queue.filter((bytes) => !gone.has(decodeJob(bytes).header.dispatch)),
      )
    }
    for (const dispatch of gone) this.state.active.delete(dispatch)
  }
  async states(jobs: readonly { readonly dispatch: number }[]): Promise<JobState[]> {
    this.#check()
    const waiting = new Set(
      [...this.state.queues.values()].flat().map((bytes) => decodeJob(bytes).header.dispatch),
    )
    return jobs.map(({ dispatch }) =>
      waiting.has(dispatch) ? 'waiting' : this.state.active.has(dispatch) ? 'active' : 'gone',
    )
  }
  async deliveries(waitMs: number): Promise<Delivery[]> {
    const untilMs = this.#clock.nowMs() + waitMs
    for (;;) {
      this.#check()
      const fresh = this.state.results.filter(({ receipt }) => !this.#read.has(receipt))
      for (const { receipt } of fresh) this.#read.add(receipt)
      if (fresh.length > 0) return fresh.map((one) => ({ complaint: '', ...one }))
      if (this.#clock.nowMs() >= untilMs || this.closed) return []
      await new Promise<void>((resolve) => {
        this.#clock.after(5, resolve)
      })
    }
  }
  async acknowledge(receipts: readonly string[]): Promise<void> {
    this.#check()
    this.acknowledged.push(...receipts)
    this.state.results = this.state.results.filter(({ receipt }) => !receipts.includes(receipt))
  }
  async agents(): Promise<Heartbeat[]> {
    this.#check()
    return [...this.state.agents.values()]
  }
  async forgetAgent(agent: string): Promise<void> {
    this.#check()
    this.state.agents.delete(agent)
    this.state.queues.delete(`to-${agent}`)
  }
  async withdraw(): Promise<void> {
    this.#check()
    this.state.announcements.delete(this.#search)
  }
  async close(): Promise<void> {
    this.closed = true
  }
}

/** An agent by hand: beats while it lives, holds what it took, answers when told. */
export class TestAgent {
  readonly name: string
  readonly host: string
  readonly processor: string
  readonly cores: number
  held: Job[] = []
  state: Heartbeat['state'] = 'working'
  readonly #queue: MemoryQueue
  readonly #search: string
  #beats = 0
  #stop: () => void = () => {}

  constructor(
    queue: MemoryQueue,
    clock: VirtualClock,
    search: string,
    name: string,
    { host = `host-${name}`, processor = 'x64', cores = 2, heartbeatMs = 1500 } = {},
  ) {
    this.#queue = queue
    this.#search = search
    this.name = name
    this.host = host
    this.processor = processor
    this.cores = cores
    const turn = () => {
      this.beat()
      this.#stop = clock.after(heartbeatMs, turn)
    }
    turn()
  }

  beat(): void {
    if (this.#queue.cutOff) return
    this.#queue.state.agents.set(this.name, {
      protocol: protocolVersion,
      agent: this.name,
      host: this.host,
      processor: this.processor,
      node: 'v20',
      skerry: '0',
      pid: 1,
      cores: this.cores,
      beat: ++this.#beats,
      state: this.state,
      stateSeconds: 0,
      held: { [this.#search]: this.held.map(({ header }) => header.dispatch) },
      simulations: 0,
      failures: 0,
      lost: 0,
      handedBack: 0,
      rate: 0,
      memoryMB: 1,
      lastWord: '',
    })
  }

  /** Takes up to so many jobs, and says so with the next beat. */
  take(most = 1): Job[] {
    const taken: Job[] = []
    while (taken.length < most) {
      const job = this.#queue.takeJob(this.name)
      if (!job) break
      taken.push(job)
    }
    this.held.push(...taken)
    return taken
  }

  /** Answers a job (or some of its places) and finishes it. */
  answer(job: Job, places = [...job.items.keys()], more: Partial<Answers['header']> = {}): string {
    this.held = this.held.filter((one) => one !== job)
    if (places.length === job.items.length) this.#queue.state.active.delete(job.header.dispatch)
    return this.#queue.deliver(answersTo(job, places, this, more))
  }

  /** kill -9. */
  die(): void {
    this.#stop()
  }
  leave(): void {
    this.#stop()
    this.#queue.state.agents.delete(this.name)
  }
}

/** The value of an item in these tests: its evaluation's number. */
export function answersTo(
  job: Job,
  places: readonly number[],
  { name, host, processor }: { readonly name: string; readonly host: string; readonly processor: string },
  more: Partial<Answers['header']> = {},
): Answers {
  return {
    header: {
      protocol: protocolVersion,
      search: job.header.search,
      record: job.header.record,
      agent: name,
      host,
      processor,
      pluginDigest: 'a'.repeat(64),
      skerry: '0',
      ...more,
    },
    answers: places.map((index) => {
      const { island, evaluation, attempt, replicates } = job.items[index]!
      const result = { values: new Float64Array(replicates).fill(evaluation), failures: [] }
      return {
        dispatch: job.header.dispatch,
        index,
        item: { island, evaluation, attempt, purpose: job.header.purpose },
        content: contentWord(job.items[index]!),
        result,
        digest: resultDigest(result),
        executor: { kind: 'thread', worker: `${host}/1/t1`, host, processor },
        cpuSeconds: 1,
        wallSeconds: 1,
      }
    }),
    losses: [],
  }
}

export function itemOf(evaluation: number, more: Partial<WorkItem> = {}): WorkItem {
  return {
    island: 1,
    evaluation,
    individual: evaluation,
    firstReplicate: 0,
    replicates: 1,
    genome: Uint8Array.of(evaluation % 256),
    expectedCost: 1,
    attempt: 1,
    purpose: 'evaluate',
    isolation: 'shared',
    avoid: [],
    ...more,
  }
}
