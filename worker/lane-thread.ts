// One simulating thread as the pool sees it: takes batches, answers items, ends once.
//
//   loading ──ready──▶ working ──(dies, hangs, is closed)──▶ ended
//
// When it ends, at most one item is blamed: the one that was running (the black box says which), or the one that
// was over its time when the thread was ended for it. All other unanswered items go back to the pool, uncounted.

import { Worker } from 'node:worker_threads'
import { check } from '../shared/check.js'
import type { Executor, LossCause, WorkItem } from '../shared/result.js'
import { emittedFile } from './entry.js'
import { Blackbox, withLastWords } from './tail.js'
import type { ThreadSettings } from './thread.js'
import {
  packBatch,
  type Simulated,
  type SimulatorMessage,
  type SimulatorSettings,
  transferable,
  unpackDone,
} from './wire.js'

/** What became of an item, if anything did. */
export interface Loss {
  readonly item: WorkItem
  readonly cause: LossCause
  readonly detail: string
}

export interface LaneEvents<Lane> {
  ready(lane: Lane): void
  answered(lane: Lane, item: WorkItem, simulated: Simulated): void
  /** Last event of a lane. `loss` is the item to blame, `back` those to be run elsewhere. */
  ended(lane: Lane, loss: Loss | undefined, back: readonly WorkItem[]): void
  /** A promise of our own code was broken inside. */
  broken(promise: string): void
}

interface Batch {
  readonly number: number
  readonly items: readonly WorkItem[]
  /** Items before this one are answered. */
  answered: number
}

/** An item and how long it has been seen running, in time that stops while this process is stopped. */
interface Watch {
  readonly batch: number
  readonly index: number
  seconds: number
}

/** How long loading the bundle may take. */
export const loadSeconds = 60

export class ThreadLane {
  readonly executor: Executor
  state: 'loading' | 'working' | 'ended' = 'loading'
  /** Why it never came to work, once it has ended without. */
  startFailure: string | undefined
  private readonly worker: Worker
  private readonly box = new Blackbox()
  private readonly events: LaneEvents<ThreadLane>
  private readonly batches: Batch[] = []
  private nextBatch = 1
  private watch: Watch | undefined
  private verdict: { readonly cause: LossCause; readonly item: WorkItem; readonly detail: string } | undefined
  private outOfMemory = false
  private stopped = false
  private loadingSeconds = 0
  private lastError = ''
  private readonly whenEnded: Promise<void>

  constructor(
    executor: Executor,
    settings: SimulatorSettings,
    megabytes: number,
    events: LaneEvents<ThreadLane>,
  ) {
    this.executor = executor
    this.events = events
    const workerData: ThreadSettings = { ...settings, blackbox: this.box.memory }
    this.worker = new Worker(emittedFile('worker/thread'), {
      workerData,
      env: {},
      execArgv: [],
      stdout: true,
      stderr: true,
      resourceLimits: { maxOldGenerationSizeMb: megabytes },
    })
    this.worker.on('message', (message: SimulatorMessage) => this.hear(message))
    this.worker.on('error', (error) => this.noteError(error))
    this.whenEnded = new Promise((resolve) => {
      this.worker.on('exit', (code) => {
        this.end(code)
        resolve()
      })
    })
  }

  /** Batches not fully answered. */
  get load(): number {
    return this.batches.length
  }

  send(items: readonly WorkItem[]): void {
    check(this.state === 'working' && items.length > 0, 'batches go to a working thread')
    const batch = { number: this.nextBatch++, items, answered: 0 }
    this.batches.push(batch)
    const message = packBatch(batch.number, items)
    this.worker.postMessage(message, transferable(message))
  }

  /** The item that is running, as far as can be seen from outside. */
  running(): WorkItem | undefined {
    const seen = this.box.running()
    const batch = seen && this.batches.find(({ number }) => number === seen.batch)
    return batch && seen && seen.index >= batch.answered ? batch.items[seen.index] : undefined
  }

  /** Time has passed: ends the thread when its item is over the limit. */
  tick(seconds: number, limitSeconds: (item: WorkItem) => number): void {
    if (this.state === 'loading') {
      this.loadingSeconds += seconds
      if (this.loadingSeconds <= loadSeconds || this.startFailure !== undefined) return
      this.startFailure = `it was still loading after ${loadSeconds} s`
      void this.worker.terminate()
      return
    }
    const seen = this.box.running()
    const item = this.running()
    if (seen === undefined || item === undefined) {
      this.watch = undefined
      return
    }
    if (this.watch?.batch !== seen.batch || this.watch.index !== seen.index)
      this.watch = { ...seen, seconds: 0 }
    this.watch.seconds += seconds
    const limit = limitSeconds(item)
    if (this.watch.seconds <= limit || this.verdict !== undefined) return
    this.verdict = { cause: 'time-limit', item, detail: `still simulating after ${limit.toPrecision(3)} s` }
    void this.worker.terminate()
  }

  /** Ends the thread, whatever it does; nobody is to blame. */
  stop(): Promise<void> {
    this.stopped = true
    if (this.state !== 'ended') void this.worker.terminate()
    return this.whenEnded
  }

  private hear(message: SimulatorMessage): void {
    if (this.state === 'ended') return
    if (message.kind === 'ready') {
      this.state = 'working'
      this.events.ready(this)
    } else if (message.kind === 'unusable') {
      this.startFailure = message.reason
      void this.worker.terminate()
    } else if (message.kind === 'broken') {
      this.events.broken(message.promise)
    } else {
      const batch = this.batches[0]
      check(batch !== undefined && batch.number === message.batch, 'batches are answered in order')
      check(batch.answered === message.first, 'items of a batch are answered in order')
      for (const simulated of unpackDone(message)) {
        const item = batch.items[batch.answered++]
        check(item !== undefined, 'an answer belongs to an item of its batch')
        if (batch.answered === batch.items.length) this.batches.shift()
        this.events.answered(this, item, simulated)
      }
    }
  }

  private noteError(error: unknown): void {
    const code = error instanceof Error && 'code' in error ? error.code : undefined
    this.outOfMemory ||= code === 'ERR_WORKER_OUT_OF_MEMORY'
    this.lastError = error instanceof Error ? error.message : String(error)
  }

  private end(exitCode: number): void {
    const blamed = this.verdict?.item ?? (this.stopped ? undefined : this.running())
    if (this.state === 'loading') {
      this.startFailure ??= withLastWords(this.lastError || `it ended with exit code ${exitCode}`, this.box)
    }
    this.state = 'ended'
    const unanswered = this.batches.splice(0).flatMap(({ items, answered }) => items.slice(answered))
    const place = blamed === undefined ? -1 : unanswered.indexOf(blamed)
    if (place >= 0) unanswered.splice(place, 1)
    const loss = blamed === undefined || place < 0 ? undefined : this.lossOf(blamed, exitCode)
    this.events.ended(this, loss, unanswered)
  }

  private lossOf(item: WorkItem, exitCode: number): Loss {
    const cause = this.verdict?.cause ?? (this.outOfMemory ? 'memory' : 'died')
    const said = this.verdict?.detail ?? (this.lastError || `the thread ended with exit code ${exitCode}`)
    return { item, cause, detail: withLastWords(said, this.box) }
  }
}
