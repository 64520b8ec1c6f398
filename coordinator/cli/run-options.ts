// What `skerry run` asks of coordinator/main.ts, what it hears while the search runs, and what it gets at the end.

import type { Exactness } from '../../shared/problem.js'
import type { ProgressView } from './progress-view.js'
import type { ChangeRowFound } from './searchfile/changes.js'
import type { Finding } from './searchfile/finding.js'

export interface RunOptions {
  /** The search file. */
  readonly file: string
  /** Folder of the record; ./records/NAME by default. */
  readonly record?: string
  /** Simulation threads; the search file's, else this machine's. */
  readonly cores?: number
  /** Stop at this many simulations over all islands. */
  readonly stopAfter?: number
  /** Take the differences between the search file and the record's copy. */
  readonly acceptChanges: boolean
  /** Take the record over from a coordinator that seems alive. */
  readonly force: boolean
  /** Folder on this machine's own disk for the work copy of a record that lies in a shared folder. */
  readonly scratch?: string
  /** Wait until whoever holds the record is gone, then go on in its place. */
  readonly standby: boolean
  /** Address of the Redis whose workers simulate; without it this machine does. */
  readonly redis?: string
  /** Take a Redis that other machines reach without a password. */
  readonly redisUnprotected: boolean
  /** Start a Redis that ends with this coordinator, and say in the record's folder where it is. */
  readonly ownRedis: boolean
  /** Under which workers reach this machine. */
  readonly address?: string
  /** File with the key of the site, which signs the problem. */
  readonly keyFile?: string
  readonly tell: (event: RunEvent) => void
  /** Aborted on SIGINT and SIGTERM: hand back, make durable, return with ended 'interrupted'. */
  readonly signal: AbortSignal
}

export type RunEvent =
  /** Something a person should read once, a sentence. */
  | { readonly kind: 'said'; readonly sentence: string }
  /** Warnings of the search file. */
  | { readonly kind: 'warned'; readonly file: string; readonly findings: readonly Finding[] }
  /** Differences to the record's copy of the search file, before they are refused or accepted. */
  | { readonly kind: 'changed'; readonly file: string; readonly changes: readonly ChangeRowFound[] }
  /** About once a second. */
  | { readonly kind: 'progress'; readonly view: ProgressView }

export interface RunEnd {
  readonly ended: 'finished' | 'stop-after' | 'interrupted'
  readonly view: ProgressView
  /** Lines for a person; the same as in the record's summary.txt. */
  readonly summary: readonly string[]
  /** The summary without what a terminal has no room for. */
  readonly brief: readonly string[]
  /** Written files, with what each is: 'picture of the best machine'. */
  readonly files: readonly { readonly what: string; readonly path: string }[]
}

export interface RederiveOptions {
  readonly record: string
  /** How many evaluations are simulated again. */
  readonly resimulate: number
  /** Folder of a new record that begins the search again with what is still believed. */
  readonly rewind?: string
  readonly cores?: number
  readonly tell: (sentence: string) => void
  readonly signal: AbortSignal
}

/** A difference throws a Refusal; a report is good news. */
export interface RederiveReport {
  readonly islands: readonly { readonly name: string; readonly commits: number; readonly digest: string }[]
  readonly digest: string
  readonly resimulated: number
  /** How many of those agreed: all, unless the problem promises no more than a likeness. */
  readonly agreed?: number
  /** Of the record: 'bits' unless the problem promises less. */
  readonly exactness: Exactness
}

/** What coordinator/main.ts offers to the commands. */
export interface House {
  readonly runSearch: (options: RunOptions) => Promise<RunEnd>
  /** Reads the record without disturbing its coordinator. */
  readonly readProgress: (record: string) => ProgressView | Promise<ProgressView>
  readonly rederive: (options: RederiveOptions) => Promise<RederiveReport>
}
