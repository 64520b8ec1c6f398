// Who may write: one row in the database, changed by a takeover and read in the transaction of every append, so
// that a coordinator which was taken over, however long it slept, can never append again.
//
// A holder on this machine is dead when its process is gone or the number belongs to another process by now.
// A holder on another machine is dead only when its beats stand still while somebody watches (watchHolder):
// clocks of two machines are never compared.

import { execFileSync } from 'node:child_process'
import { readFileSync, readlinkSync } from 'node:fs'
import { hostname } from 'node:os'
import { refuse } from '../../shared/refusals.js'
import { rollBack, transact } from './database.js'
import type { GuardedDatabase } from './guard.js'
import { numberAt, textAt } from './rows.js'
import type { Statement } from './storage.js'

/** A process that may hold a record. */
export interface ProcessIdentity {
  readonly host: string
  /** Equal where process numbers mean the same: machine, boot and process namespace. */
  readonly machine: string
  readonly pid: number
  /** When the process started, in whatever form this system gives it: tells a process from a later one. */
  readonly processStart: string
}
export interface Holder extends ProcessIdentity {
  readonly epoch: number
  /** '' when nobody holds the record. */
  readonly nonce: string
  /** By the holder's own clock. */
  readonly sinceMs: number
  readonly beats: number
  readonly beatMs: number
}
/** What was seen of a holder; a takeover that relies on its silence is void when it has moved meanwhile. */
export type HolderSeen = Pick<Holder, 'epoch' | 'nonce' | 'beats'>

export type Takeover = 'if-dead' | 'force' | HolderSeen

/** This process, as a holder. */
export function thisProcess(): ProcessIdentity {
  return {
    host: hostname(),
    machine: machineOf(hostname()),
    pid: process.pid,
    processStart: startOf(process.pid) ?? `unknown-${process.pid}`,
  }
}

function machineOf(host: string): string {
  try {
    const boot = readFileSync('/proc/sys/kernel/random/boot_id', 'utf8').trim()
    return `${host} ${boot} ${readlinkSync('/proc/self/ns/pid')}`
  } catch {
    return host
  }
}

/** Start of a process, or undefined when there is none of that number. */
function startOf(pid: number): string | undefined {
  try {
    // Field 22 of proc_pid_stat(5), counted after the command's closing bracket (the command may hold anything).
    const stat = readFileSync(`/proc/${pid}/stat`, 'utf8')
    const fields = stat.slice(stat.lastIndexOf(')') + 2).split(' ')
    return fields[0] === 'Z' || fields[0] === 'X' ? undefined : fields[19]
  } catch {
    return process.platform === 'linux' ? undefined : startByPs(pid)
  }
}

function startByPs(pid: number): string | undefined {
  try {
    return execFileSync('ps', ['-o', 'lstart=', '-p', String(pid)], { encoding: 'utf8' }).trim() || undefined
  } catch {
    return undefined
  }
}

/** Does the process still run? Asked only about processes of this machine. */
export function isRunning(holder: ProcessIdentity): boolean {
  return startOf(holder.pid) === holder.processStart
}

const selectHolder =
  'SELECT epoch, nonce, host, machine, pid, process_start, since_ms, beats, beat_ms FROM holder WHERE one = 1'

/** The holder's row; its nonce is '' when the record is free. */
export function readHolder(database: GuardedDatabase): Holder {
  const row = database.prepare(selectHolder).get()
  if (!row) throw refuse('record-corrupted', { detail: 'the row that says who may write is missing' })
  return {
    epoch: numberAt(row, 0),
    nonce: textAt(row, 1),
    host: textAt(row, 2),
    machine: textAt(row, 3),
    pid: numberAt(row, 4),
    processStart: textAt(row, 5),
    sinceMs: numberAt(row, 6),
    beats: numberAt(row, 7),
    beatMs: numberAt(row, 8),
  }
}

/** 'process 4711 on node17, since 2026-12-01 09:00:00 UTC' */
export function nameHolder(holder: Pick<Holder, 'pid' | 'host' | 'sinceMs'>): string {
  return `process ${holder.pid} on ${holder.host}, since ${renderTime(holder.sinceMs)}`
}
export function renderTime(ms: number): string {
  const date = new Date(ms)
  return Number.isNaN(date.getTime())
    ? 'an unknown time'
    : `${date.toISOString().slice(0, 19).replace('T', ' ')} UTC`
}

export interface Claim {
  readonly me: ProcessIdentity
  /** Unique to this opening of the record. */
  readonly nonce: string
  readonly clock: () => number
  readonly takeover: Takeover
  readonly isRunning: (holder: ProcessIdentity) => boolean
}

/** The right to append, for as long as nobody takes it over. */
export class Hold {
  readonly #database: GuardedDatabase
  readonly #fence: Statement
  readonly #beat: Statement
  readonly #claim: Claim
  readonly epoch: number
  /** Why the former holder was passed over, for people; undefined when the record was free. */
  readonly tookOver: string | undefined

  private constructor(database: GuardedDatabase, claim: Claim, epoch: number, tookOver: string | undefined) {
    this.#database = database
    this.#claim = claim
    this.epoch = epoch
    this.tookOver = tookOver
    this.#fence = database.prepare('SELECT epoch, nonce, host, pid, since_ms FROM holder WHERE one = 1')
    this.#beat = database.prepare('UPDATE holder SET beats = beats + 1, beat_ms = ? WHERE one = 1')
  }

  /** Becomes the holder. @throws Refusal 'record-in-use' that names who holds it, at once. */
  static take(database: GuardedDatabase, claim: Claim): Hold {
    // First without a lock: a living holder is named at once even while it writes.
    reasonToTake(readHolder(database), claim)
    return transact(database, () => {
      const before = readHolder(database)
      const reason = reasonToTake(before, claim)
      const epoch = before.epoch + 1
      const { host, machine, pid, processStart } = claim.me
      const now = Math.trunc(claim.clock())
      database
        .prepare(
          `UPDATE holder SET epoch = ?, nonce = ?, host = ?, machine = ?, pid = ?, process_start = ?,
           since_ms = ?, beats = 0, beat_ms = ? WHERE one = 1`,
        )
        .run(epoch, claim.nonce, host, machine, pid, processStart, now, now)
      return new Hold(database, claim, epoch, reason)
    })
  }

  /** The fence: to be called inside the transaction that it guards. @throws Refusal 'record-fenced' */
  assertHeld(): void {
    const row = this.#fence.get()
    if (row && row[0] === this.epoch && row[1] === this.#claim.nonce) return
    const now = row?.[1]
      ? `process ${String(row[3])} on ${String(row[2])} holds it since ${renderTime(Number(row[4]))}`
      : 'somebody has taken it over and let it go again'
    throw refuse('record-fenced', { detail: now })
  }

  /** A sign of life for other machines; every few seconds, also when there is nothing to append. */
  beat(): void {
    transact(this.#database, () => {
      this.assertHeld()
      this.#beat.run(Math.trunc(this.#claim.clock()))
    })
  }

  /** Lets the record go, so that the next coordinator need not ask whether this one lives. */
  release(): void {
    if (this.#database.broken) return
    try {
      transact(this.#database, () => {
        this.assertHeld()
        this.#database.exec("UPDATE holder SET nonce = '' WHERE one = 1")
      })
    } catch {
      // Taken over already, or the disk is full: the next coordinator finds this process gone.
      rollBack(this.#database)
    }
  }
}

/** Undefined when the record is free, a sentence when its holder may be passed over. @throws Refusal otherwise. */
function reasonToTake(holder: Holder, claim: Claim): string | undefined {
  if (holder.nonce === '') return undefined
  const name = nameHolder(holder)
  if (claim.takeover === 'force') return `taken over by force from ${name}`
  const here = holder.machine === claim.me.machine
  if (here && !claim.isRunning(holder)) return `taken over from ${name}, which is no longer running`
  const seen = claim.takeover
  if (!here && seen !== 'if-dead') {
    const silent = seen.epoch === holder.epoch && seen.nonce === holder.nonce && seen.beats === holder.beats
    if (silent) return `taken over from ${name}, which gave no sign of life while it was watched`
  }
  throw refuse('record-in-use', {
    detail: name,
    cure: here
      ? `Wait for it to end, or stop it: kill ${holder.pid}`
      : `Stop it on ${holder.host}; if that machine is gone, take the record over once its silence is certain.`,
  })
}
