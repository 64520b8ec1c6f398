// A child process of ours: cleared environment, a folder of its own, output kept as a black box, ended together with
// everything it started. What it says and does is up to its entry file (alone.ts, agent.ts).

import { type ChildProcess, fork } from 'node:child_process'
import { mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import type { LossCause } from '../shared/result.js'
import { emittedFile } from './entry.js'
import { Blackbox, withLastWords } from './tail.js'

/** Why we ended it; without a cause nobody is to blame. */
export interface Verdict {
  readonly cause?: LossCause
  readonly detail: string
}

/** How it ended: by our verdict or by itself. */
export interface Ending {
  readonly cause: LossCause
  readonly detail: string
}

export interface ChildEvents<Message> {
  message(message: Message): void
  /** Last event; whatever it printed has been read. */
  gone(ending: Ending): void
}

const pageBytes = 4096

export class Child<Order, Message> {
  /** Set once we have ended it. */
  verdict: Verdict | undefined
  readonly whenGone: Promise<void>
  private readonly process: ChildProcess
  private readonly folder = mkdtempSync(join(tmpdir(), 'skerry-work-'))
  private readonly box = new Blackbox()

  /** Starts the emitted file of `entry`; `heapMegabytes` bounds its JavaScript heap. */
  constructor(entry: string, heapMegabytes: number | undefined, events: ChildEvents<Message>) {
    const forked = fork(emittedFile(entry), [], {
      cwd: this.folder,
      // Local times and texts of a plug-in do not depend on where it runs.
      env: { TZ: 'UTC', LC_ALL: 'C' },
      // What a simulation leaves behind is little: helpers that collect it side by side cost more than they save.
      execArgv: [
        '--single-threaded-gc',
        ...(heapMegabytes === undefined ? [] : [`--max-old-space-size=${heapMegabytes}`]),
      ],
      serialization: 'advanced',
      stdio: ['ignore', 'ignore', 'pipe', 'ipc'],
      // A process group of its own, so that it can be ended with its children.
      detached: true,
    })
    this.process = forked
    forked.stderr?.on('data', (bytes: Buffer) => this.box.print(bytes))
    forked.on('message', (message) => events.message(message as Message))
    this.whenGone = new Promise((resolve) => {
      const gone = (ending: string) => {
        rmSync(this.folder, { recursive: true, force: true })
        events.gone(this.endingOf(ending))
        resolve()
      }
      forked.once('close', (code, signal) => gone(signal ? `signal ${signal}` : `exit code ${code}`))
      // When it could not even start, no 'close' follows.
      forked.on('error', (error) => {
        if (forked.pid === undefined) gone(error.message)
      })
    })
  }

  get pid(): number | undefined {
    return this.process.pid
  }

  send(order: Order): void {
    // That a channel has just closed is reported by 'close'; the error adds nothing.
    if (this.process.connected) this.process.send(order as object, () => undefined)
  }

  /** Kills it with its whole group, whatever it does. The first verdict stands. */
  end(verdict: Verdict): void {
    this.verdict ??= verdict
    try {
      if (this.process.pid !== undefined) process.kill(-this.process.pid, 'SIGKILL')
    } catch {
      this.process.kill('SIGKILL')
    }
  }

  /** Memory it holds, where the system tells (Linux). */
  residentMegabytes(): number | undefined {
    try {
      const pages = Number(readFileSync(`/proc/${this.pid}/statm`, 'utf8').split(' ')[1])
      return Number.isFinite(pages) ? (pages * pageBytes) / 2 ** 20 : undefined
    } catch {
      return undefined
    }
  }

  private endingOf(ending: string): Ending {
    const heap = /heap out of memory/.test(this.box.lastWords(65_536))
    const cause = this.verdict?.cause ?? (heap ? 'memory' : 'died')
    return {
      cause,
      detail: withLastWords(this.verdict?.detail ?? `the process ended with ${ending}`, this.box),
    }
  }
}
