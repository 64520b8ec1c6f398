// One child process as the pool sees it: simulates one item at a time, in a cleared environment and a folder of its
// own, under limits of time and memory, and is killed with its whole process group. Whoever kills it is known for
// certain, because nothing else was running.
//
//   (none) ──item──▶ starting ──ready──▶ busy ◀──▶ idle        (a fresh process after `itemsMost` items)
//                        └──────────── died, killed ────▶ (none)

import { type ChildProcess, fork } from 'node:child_process'
import { mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import type { Executor, LossCause, WorkItem } from '../shared/result.js'
import type { ChildOrder } from './alone.js'
import { emittedFile } from './entry.js'
import { type Loss, loadSeconds, withLastWords } from './lane-thread.js'
import { Blackbox } from './tail.js'
import {
  packBatch,
  type Simulated,
  type SimulatorMessage,
  type SimulatorSettings,
  unpackDone,
} from './wire.js'

export interface ProcessLaneOptions {
  readonly settings: SimulatorSettings
  readonly host: string
  readonly megabytes: number
  /** Items one process may simulate before a fresh one takes over. */
  readonly itemsMost: number
}

export interface ProcessLaneEvents {
  answered(item: WorkItem, simulated: Simulated, executor: Executor): void
  lost(loss: Loss, executor: Executor): void
  /** Process after process died before it was ready. */
  unusable(reason: string): void
  broken(promise: string): void
}

/** A process without a simulation holds about this much; what it may hold beyond is the simulation's. */
const ownMegabytes = 160
const pageBytes = 4096
/** Processes in a row that may die before they are ready. */
const failedStartsMost = 3

interface Child {
  readonly process: ChildProcess
  readonly folder: string
  readonly executor: Executor
  readonly box: Blackbox
  readonly whenGone: Promise<void>
  ready: boolean
  loadingSeconds: number
  items: number
  /** Set when we ended it, and why; undefined cause: nobody's fault. */
  verdict?: { readonly cause: LossCause | undefined; readonly detail: string }
}

export class ProcessLane {
  private readonly options: ProcessLaneOptions
  private readonly events: ProcessLaneEvents
  private readonly queue: WorkItem[] = []
  private child: Child | undefined
  private running: { readonly item: WorkItem; seconds: number } | undefined
  private closed = false
  private failedStarts = 0
  private readonly leaving = new Set<Promise<void>>()

  constructor(options: ProcessLaneOptions, events: ProcessLaneEvents) {
    this.options = options
    this.events = events
  }

  /** Items waiting or running. */
  get load(): number {
    return this.queue.length + (this.running ? 1 : 0)
  }

  add(item: WorkItem): void {
    this.queue.push(item)
    this.next()
  }

  /** Time has passed: ends the process when its item is over a limit. */
  tick(seconds: number, limitSeconds: (item: WorkItem) => number): void {
    const { child, running } = this
    if (child === undefined || child.verdict !== undefined) return
    if (!child.ready) {
      child.loadingSeconds += seconds
      if (child.loadingSeconds > loadSeconds) {
        this.kill(child, { cause: undefined, detail: `it was still loading after ${loadSeconds} s` })
      }
      return
    }
    if (running === undefined) return
    running.seconds += seconds
    const limit = limitSeconds(running.item)
    if (running.seconds > limit) {
      this.kill(child, { cause: 'time-limit', detail: `still simulating after ${limit.toPrecision(3)} s` })
      return
    }
    const megabytes = residentMegabytes(child.process.pid)
    if (megabytes !== undefined && megabytes > this.options.megabytes + ownMegabytes) {
      const detail = `held ${megabytes.toFixed(0)} MB; a simulation may hold ${this.options.megabytes} MB`
      this.kill(child, { cause: 'memory', detail })
    }
  }

  /** Ends the process, whatever it does. */
  async stop(): Promise<void> {
    this.closed = true
    this.queue.length = 0
    if (this.child) this.kill(this.child, { cause: undefined, detail: 'closed' })
    await Promise.all(this.leaving)
  }

  private next(): void {
    if (this.closed || this.running !== undefined) return
    if (this.child !== undefined && this.child.items >= this.options.itemsMost) {
      this.kill(this.child, { cause: undefined, detail: 'replaced by a fresh process' })
      this.child = undefined
    }
    const item = this.queue[0]
    if (item === undefined) return
    this.child ??= this.start()
    if (!this.child.ready) return
    this.queue.shift()
    this.running = { item, seconds: 0 }
    this.child.items++
    this.order(this.child, { item: packBatch(this.child.items, [item]) })
  }

  private start(): Child {
    const folder = mkdtempSync(join(tmpdir(), 'skerry-alone-'))
    const forked = fork(emittedFile('worker/alone'), [], {
      cwd: folder,
      env: {},
      execArgv: [`--max-old-space-size=${this.options.megabytes}`],
      serialization: 'advanced',
      stdio: ['ignore', 'ignore', 'pipe', 'ipc'],
      detached: true,
    })
    const box = new Blackbox()
    const worker = `${this.options.host}/${forked.pid}`
    const executor: Executor = { kind: 'process', worker, host: this.options.host }
    const whenGone = new Promise<void>((resolve) => {
      // 'close' comes after the last words have been read; after 'error' (could not start) nothing else may come.
      forked.once('close', (code, signal) => resolve(this.gone(child, code, signal)))
      forked.once('error', (error) => {
        box.print(new TextEncoder().encode(error.message))
        if (forked.pid === undefined) resolve(this.gone(child, null, null))
      })
    })
    const child: Child = {
      process: forked,
      folder,
      executor,
      box,
      whenGone,
      ready: false,
      loadingSeconds: 0,
      items: 0,
    }
    this.leaving.add(whenGone)
    void whenGone.then(() => this.leaving.delete(whenGone))
    forked.stderr?.on('data', (bytes: Buffer) => box.print(bytes))
    forked.on('message', (message) => this.hear(child, message as SimulatorMessage))
    this.order(child, { settings: this.options.settings })
    return child
  }

  private order(child: Child, order: ChildOrder): void {
    // A channel that has just closed is reported by 'close'; the error adds nothing.
    if (child.process.connected) child.process.send(order, () => undefined)
  }

  private hear(child: Child, message: SimulatorMessage): void {
    if (child !== this.child || this.closed) return
    if (message.kind === 'ready') {
      child.ready = true
      this.failedStarts = 0
    } else if (message.kind === 'unusable') {
      this.kill(child, { cause: undefined, detail: message.reason })
    } else if (message.kind === 'broken') {
      this.events.broken(message.promise)
    } else if (this.running !== undefined && child.verdict === undefined) {
      const { item } = this.running
      this.running = undefined
      for (const simulated of unpackDone(message)) this.events.answered(item, simulated, child.executor)
    }
    if (child.verdict === undefined) this.next()
  }

  private kill(child: Child, verdict: NonNullable<Child['verdict']>): void {
    child.verdict ??= verdict
    try {
      // The group: a child that had children of its own takes them along.
      if (child.process.pid !== undefined) process.kill(-child.process.pid, 'SIGKILL')
    } catch {
      child.process.kill('SIGKILL')
    }
  }

  private gone(child: Child, code: number | null, signal: NodeJS.Signals | null): void {
    rmSync(child.folder, { recursive: true, force: true })
    if (child !== this.child) return
    this.child = undefined
    if (this.closed) return
    const item = this.running?.item
    this.running = undefined
    if (!child.ready && ++this.failedStarts >= failedStartsMost) {
      this.events.unusable(withLastWords(child.verdict?.detail ?? endingOf(code, signal), child.box))
      return
    }
    if (item !== undefined) this.events.lost(lossOf(item, child, code, signal), child.executor)
    this.next()
  }
}

function lossOf(item: WorkItem, child: Child, code: number | null, signal: NodeJS.Signals | null): Loss {
  const heap = /heap out of memory/.test(child.box.lastWords(65_536))
  const cause = child.verdict?.cause ?? (heap ? 'memory' : 'died')
  const said = child.verdict?.detail ?? endingOf(code, signal)
  return { item, cause, detail: withLastWords(said, child.box) }
}

function endingOf(code: number | null, signal: NodeJS.Signals | null): string {
  return `the process ended with ${signal === null ? `exit code ${code ?? 'unknown'}` : `signal ${signal}`}`
}

/** Memory a process holds, where the system tells (Linux). */
function residentMegabytes(pid: number | undefined): number | undefined {
  try {
    const pages = Number(readFileSync(`/proc/${pid}/statm`, 'utf8').split(' ')[1])
    return Number.isFinite(pages) ? (pages * pageBytes) / 2 ** 20 : undefined
  } catch {
    return undefined
  }
}
