// A Redis of the coordinator's own: a child process on a free port, with passwords made for this run, that ends with
// its parent however that ends. For sites where nobody runs a server: the search's Redis lives and dies with the
// coordinator's job, and workers find it through the record's folder.

import { type ChildProcess, spawn } from 'node:child_process'
import { createHash, randomBytes } from 'node:crypto'
import { chmodSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { createServer } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { plainText, type Refusal, refuse } from '../../shared/refusals.js'

export interface OwnServerOptions {
  /** Name or address under which other machines reach this one. */
  readonly address: string
  /** Listen on that address only; otherwise on all of this machine's. */
  readonly bindAddressOnly: boolean
  readonly prefix: string
  /** Program to start; 'redis-server' unless said. */
  readonly program?: string
  readonly megabytesMost?: number
  /** It ended, and was started again, empty, at the same place. */
  readonly restarted: (why: string) => void
  /** It ended, and could not be started again. */
  readonly lost: (refusal: Refusal) => void
}

export interface OwnServer {
  /** For the coordinator, on this machine. */
  readonly coordinatorUrl: string
  /** For workers anywhere. */
  readonly workerUrl: string
  readonly port: number
  close(): Promise<void>
}

const startMs = 10_000
const restartPauseMs = 300
/** In a row, each within a minute of the last. */
const restartsMost = 5
const restartsForgottenMs = 60_000
const passwordBytes = 32
const usualMegabytes = 512
const wordsKept = 2000

/** Ends the server when our end of its standard input closes: also when we are killed. */
const guard =
  'exec 3<&0; "$0" "$1" </dev/null & server=$!; (cat <&3 >/dev/null; kill "$server") & wait "$server"'

/** @throws Refusal 'queue-unreachable' when redis-server is missing or does not start */
export async function startOwnServer(options: OwnServerOptions): Promise<OwnServer> {
  const folder = mkdtempSync(join(tmpdir(), 'skerry-redis-'))
  chmodSync(folder, 0o700)
  const server = new Server(options, join(folder, 'redis.conf'), folder)
  try {
    const passwords = { coordinator: password(), worker: password() }
    const port = await freePort(options.bindAddressOnly ? options.address : '0.0.0.0')
    const text = configuration(options, port, folder, passwords)
    writeFileSync(join(folder, 'redis.conf'), text, { mode: 0o600 })
    await server.start()
    const local = options.bindAddressOnly ? options.address : '127.0.0.1'
    return {
      coordinatorUrl: `redis://coordinator:${passwords.coordinator}@${local}:${port}`,
      workerUrl: `redis://worker:${passwords.worker}@${options.address}:${port}`,
      port,
      close: () => server.close(),
    }
  } catch (error) {
    await server.close()
    throw error
  }
}

class Server {
  private readonly options: OwnServerOptions
  private readonly configFile: string
  private readonly folder: string
  private child: ChildProcess | undefined
  private closed = false
  private restarts = 0
  private startedMs = 0
  private lastWords = ''

  constructor(options: OwnServerOptions, configFile: string, folder: string) {
    this.options = options
    this.configFile = configFile
    this.folder = folder
  }

  /** Resolves when the server accepts connections; from then on it is started again when it ends. */
  start(): Promise<void> {
    this.lastWords = ''
    this.startedMs = performance.now()
    return new Promise((resolve, reject) => {
      const child = spawn('sh', ['-c', guard, this.options.program ?? 'redis-server', this.configFile], {
        stdio: ['pipe', 'pipe', 'pipe'],
        // A group of its own: what the keyboard or a job's end sends to ours must not end it before its search.
        detached: true,
      })
      this.child = child
      let ready = false
      const late = setTimeout(() => {
        child.stdin.end()
        reject(this.trouble(`it was not ready after ${startMs / 1000} s`))
      }, startMs)
      const hear = (bytes: Buffer) => {
        this.lastWords = `${this.lastWords}${bytes.toString('utf8')}`.slice(-wordsKept)
        if (ready || !this.lastWords.includes('Ready to accept connections')) return
        ready = true
        clearTimeout(late)
        resolve()
      }
      child.stdout.on('data', hear)
      child.stderr.on('data', hear)
      child.stdin.on('error', () => {})
      child.on('error', (error) => reject(this.trouble(error.message)))
      child.on('exit', () => {
        clearTimeout(late)
        child.stdin.destroy()
        if (ready) this.ended()
        else reject(this.trouble('it ended at once'))
      })
    })
  }

  async close(): Promise<void> {
    this.closed = true
    const { child } = this
    if (child?.stdin && child.exitCode === null && child.signalCode === null) {
      const gone = new Promise((resolve) => child.once('exit', resolve))
      child.stdin.end()
      await gone
    }
    rmSync(this.folder, { recursive: true, force: true })
  }

  private ended(): void {
    if (this.closed) return
    const why = this.words()
    if (performance.now() - this.startedMs > restartsForgottenMs) this.restarts = 0
    if (++this.restarts > restartsMost) {
      this.options.lost(this.trouble(`it ended ${this.restarts} times in a row`))
      return
    }
    setTimeout(() => {
      if (this.closed) return
      this.start().then(
        () => this.options.restarted(why),
        (error: Refusal) => this.options.lost(error),
      )
    }, restartPauseMs)
  }

  private words(): string {
    return plainText(this.lastWords.trim().split('\n').at(-1) ?? '').slice(0, 300)
  }

  private trouble(what: string): Refusal {
    return refuse('queue-unreachable', {
      detail: `redis-server could not be kept running: ${what}. ${this.words()}`.trim(),
      cure: 'Install redis-server (Debian: apt-get install redis-server) or name a running Redis with --redis URL.',
    })
  }
}

function configuration(
  { address, bindAddressOnly, prefix, megabytesMost }: OwnServerOptions,
  port: number,
  folder: string,
  passwords: { readonly coordinator: string; readonly worker: string },
): string {
  return [
    `bind ${bindAddressOnly ? address : '* -::*'}`,
    `port ${port}`,
    `dir ${folder}`,
    'save ""',
    'appendonly no',
    `maxmemory ${megabytesMost ?? usualMegabytes}mb`,
    'maxmemory-policy noeviction',
    'daemonize no',
    'user default off',
    `user coordinator on #${hashOf(passwords.coordinator)} ${coordinatorRights(prefix)}`,
    `user worker on #${hashOf(passwords.worker)} ${workerRights(prefix)}`,
    '',
  ].join('\n')
}

const usual =
  '-@all +@read +@write +@stream +@scripting +@blocking +@connection +@transaction +time -@dangerous'

/** Everything of ours, and what the checks at the start ask. */
export function coordinatorRights(prefix: string): string {
  return `resetkeys ~${prefix}:* resetchannels ${usual} +info +config|get -keys`
}

/** Takes jobs and writes results; cannot change a pinned problem, reach another prefix or empty the server. */
export function workerRights(prefix: string): string {
  const read = ['searches', 's:*:instance', 's:*:plugin'].map((key) => `%R~${prefix}:${key}`)
  const written = ['agents', 'tokens:*', 's:*:results', 's:*:work:*', 's:*:to-*'].map(
    (key) => `~${prefix}:${key}`,
  )
  return `resetkeys ${[...read, ...written].join(' ')} resetchannels ${usual} +info -keys`
}

function password(): string {
  return randomBytes(passwordBytes).toString('hex')
}

function hashOf(text: string): string {
  return createHash('sha256').update(text).digest('hex')
}

function freePort(address: string): Promise<number> {
  return new Promise((resolve, reject) => {
    const server = createServer()
    server.once('error', (error) => {
      const detail = `this machine cannot listen on ${address}: ${error.message}`
      reject(refuse('queue-unreachable', { detail }))
    })
    server.listen(0, address, () => {
      const found = server.address()
      server.close(() => resolve(typeof found === 'object' && found !== null ? found.port : 0))
    })
  })
}
