// One connection to Redis. It tries again by itself with waits that are capped and spread, fails every command at
// once while it is down, and lets no command take longer than its time: a frozen server looks like a broken one.
//
// Nothing is queued or sent again here. A command that failed may have been done all the same (the answer was lost);
// whoever calls must be able to bear that.

import { Redis, type RedisOptions } from 'ioredis'
import type { ClusterTimes } from '../../shared/cluster/times.js'
import { type Refusal, refuse } from '../../shared/refusals.js'
import { type RedisAddress, showAddress } from './address.js'
import { greeting, tlsMismatch } from './diagnose.js'
import { asRefusal, isFinal, isPlain } from './faults.js'

export interface LinkOptions {
  readonly address: RedisAddress
  readonly times: ClusterTimes
  /** Name that CLIENT LIST shows. */
  readonly name: string
  /** Over how long this client and its like spread their return; 0 for one of a kind. */
  readonly spreadMs?: () => number
}

const firstWaitMs = 20
/** Slowest network that a large command must still get through: 1 Mbit/s. */
const bytesPerMs = 125

export class Link {
  readonly shown: string
  readonly #client: Redis
  readonly #address: RedisAddress
  readonly #times: ClusterTimes
  #final: Refusal | undefined
  #last: Refusal | undefined
  #closed = false
  #connections = 0

  constructor({ address, times, name, spreadMs = () => 0 }: LinkOptions) {
    this.shown = showAddress(address)
    this.#address = address
    this.#times = times
    this.#client = new Redis({
      ...connectionOptions(address, times),
      connectionName: name,
      retryStrategy: (tries) => (this.#final || this.#closed ? null : this.#waitMs(tries, spreadMs())),
      // A failover turned the primary into a replica: the name may lead to another machine by now.
      reconnectOnError: (error) => error.message.startsWith('READONLY'),
    })
    this.#client.on('error', (fault: Error) => this.#note(fault))
    this.#client.on('ready', () => {
      this.#connections++
      this.#last = undefined
    })
  }

  /** The client itself, for the queue library. */
  get client(): Redis {
    return this.#client
  }
  get connected(): boolean {
    return this.#client.status === 'ready'
  }
  /** How often a connection was made. */
  get connections(): number {
    return this.#connections
  }
  /** What ended the link for good. */
  get final(): Refusal | undefined {
    return this.#final
  }

  /** The first connection: succeeds or refuses within the time of a command; nothing is tried twice. */
  async open(): Promise<void> {
    try {
      await this.#inTime(this.#client.connect(), 2 * this.#times.commandMs)
    } catch (fault) {
      // The reason comes as an event; the rejected promise only says that the connection was closed.
      const refusal = this.#final ?? this.#last ?? asRefusal(fault, this.shown)
      this.close()
      throw await this.#diagnosed(refusal)
    }
  }

  async #diagnosed(refusal: Refusal): Promise<Refusal> {
    if (isPlain(refusal.cause ?? refusal.detail)) return refusal
    const said = await greeting(this.#address, this.#times.commandMs / 4)
    if (said !== undefined && isPlain(said)) return asRefusal(said, this.shown)
    const what = await tlsMismatch(this.#address, this.#times.commandMs)
    return what === undefined
      ? refusal
      : refuse('queue-tls', { detail: `${this.shown}: ${what}`, cause: refusal })
  }

  /** Runs a command, or several; refuses at once when there is no connection, and after commandMs when nobody answers. */
  async run<Answer>(work: (client: Redis) => Promise<Answer>, bytes = 0): Promise<Answer> {
    if (this.#final) throw this.#final
    if (!this.connected) throw this.#last ?? this.#silent('the connection is down')
    try {
      return await this.#inTime(work(this.#client), this.#times.commandMs + bytes / bytesPerMs)
    } catch (fault) {
      throw this.#final ?? asRefusal(fault, this.shown)
    }
  }

  /** Drops the connection and makes another. */
  restart(): void {
    if (!this.#closed && !this.#final) this.#client.disconnect(true)
  }

  close(): void {
    this.#closed = true
    this.#client.disconnect()
  }

  #waitMs(tries: number, spreadMs: number): number {
    const baseMs = Math.min(this.#times.reconnectMostMs, firstWaitMs * 2 ** Math.min(tries - 1, 20))
    return Math.max(1, baseMs * (0.5 + 0.5 * Math.random()) + spreadMs * Math.random())
  }

  #note(fault: Error): void {
    const refusal = asRefusal(fault, this.shown)
    // A pipe that breaks after the server has said why must not hide that.
    if (isPlain(fault) || this.#last === undefined) this.#last = refusal
    if (isFinal(fault)) this.#final ??= refusal
  }

  #silent(what: string): Refusal {
    return refuse('queue-unreachable', { detail: `${this.shown}: ${what}` })
  }

  /**
   * The time is waited for in two halves: a process that was stopped finds its timers overdue when it wakes, and the
   * answer already there; the second half gives it the time to read it.
   */
  async #inTime<Answer>(answer: Promise<Answer>, limitMs: number): Promise<Answer> {
    // When the time is over first, nobody listens any more.
    answer.catch(() => {})
    let timer: NodeJS.Timeout | undefined
    const late = new Promise<never>((_, reject) => {
      timer = setTimeout(() => {
        timer = setTimeout(() => {
          const seconds = Number((limitMs / 1000).toPrecision(2))
          const refusal = this.#silent(`no answer within ${seconds} s`)
          this.#last = refusal
          this.restart()
          reject(refusal)
        }, limitMs / 2)
      }, limitMs / 2)
    })
    try {
      return await Promise.race([answer, late])
    } finally {
      clearTimeout(timer)
    }
  }
}

function connectionOptions(
  address: RedisAddress,
  times: ClusterTimes,
): RedisOptions & { readonly replyMapping: 'legacy' } {
  const { host, port, db, username, password, tls, ca } = address
  return {
    host,
    port,
    db,
    ...(username === undefined ? {} : { username }),
    ...(password === undefined ? {} : { password }),
    ...(tls ? { tls: ca === undefined ? {} : { ca } } : {}),
    lazyConnect: true,
    connectTimeout: times.commandMs,
    disconnectTimeout: Math.ceil(times.commandMs / 4),
    // The backstop for the library's own commands; ours have their time from #inTime.
    commandTimeout: 2 * times.commandMs,
    // Fail at once, resend nothing: who calls decides.
    enableOfflineQueue: false,
    maxRetriesPerRequest: 0,
    autoResendUnfulfilledCommands: false,
    disableClientInfo: true,
    // Replies in the shapes that all versions of Redis know.
    protocol: 2,
    replyMapping: 'legacy',
  }
}
