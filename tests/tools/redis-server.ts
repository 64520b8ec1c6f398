// A real redis-server for a test: on loopback, on a free port, keeping nothing on disk unless asked, gone with the
// test.

import { type ChildProcess, execFileSync, spawn } from 'node:child_process'
import { mkdtempSync, rmSync } from 'node:fs'
import { createConnection, createServer } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'

export class RedisServer {
  readonly port: number
  readonly folder = mkdtempSync(join(tmpdir(), 'skerry-redis-'))
  #arguments: readonly string[]
  #process: ChildProcess | undefined

  private constructor(port: number, more: readonly string[]) {
    this.port = port
    this.#arguments = more
  }

  /** Starts a server; `more` are further arguments, e.g. ['--maxmemory', '8mb']. */
  static async start(more: readonly string[] = []): Promise<RedisServer> {
    const server = new RedisServer(await freePort(), more)
    await server.start()
    return server
  }

  get url(): string {
    return `redis://127.0.0.1:${this.port}`
  }
  get pid(): number {
    return this.#process?.pid ?? 0
  }

  async start(more: readonly string[] = this.#arguments): Promise<void> {
    this.#arguments = more
    const usual = ['--port', `${this.port}`, '--bind', '127.0.0.1', '--save', '', '--appendonly', 'no']
    this.#process = spawn('redis-server', [...usual, '--dir', this.folder, ...more], { stdio: 'ignore' })
    await this.answering()
  }

  /** Resolves when somebody listens. */
  async answering(): Promise<void> {
    for (let tries = 0; tries < 200; tries++) {
      if (await listens(this.port)) return
      await pause(25)
    }
    throw new Error('redis-server did not start')
  }

  signal(name: NodeJS.Signals): void {
    this.#process?.kill(name)
  }

  /** kill -9, and waits until it is gone. */
  async kill(): Promise<void> {
    const child = this.#process
    this.#process = undefined
    if (!child || child.exitCode !== null || child.signalCode !== null) return
    const gone = new Promise((resolve) => child.once('exit', resolve))
    child.kill('SIGKILL')
    await gone
  }

  /** What redis-cli prints. */
  ask(...words: string[]): string {
    return execFileSync('redis-cli', ['-p', `${this.port}`, ...words], {
      encoding: 'utf8',
      timeout: 10_000,
    }).trim()
  }

  async close(): Promise<void> {
    await this.kill()
    rmSync(this.folder, { recursive: true, force: true })
  }
}

export function freePort(): Promise<number> {
  return new Promise((resolve, reject) => {
    const server = createServer()
    server.once('error', reject)
    server.listen(0, '127.0.0.1', () => {
      const address = server.address()
      server.close(() => resolve(typeof address === 'object' && address ? address.port : 0))
    })
  })
}

function listens(port: number): Promise<boolean> {
  return new Promise((resolve) => {
    const socket = createConnection({ port, host: '127.0.0.1' }, () => done(true))
    socket.once('error', () => done(false))
    function done(truth: boolean) {
      socket.destroy()
      resolve(truth)
    }
  })
}

export const pause = (ms: number): Promise<void> =>
  new Promise((resolve) => {
    setTimeout(resolve, ms)
  })
