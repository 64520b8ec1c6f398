// The rows of a record in memory, with the indices its reader needs. Rows come in as copies and leave as such
// where the engine could change them.

import { check } from '../../shared/check.js'
import { emptyChain } from '../../shared/digests.js'
import type {
  Append,
  ArrivalRow,
  BirthRow,
  CommitRow,
  ConfirmationRow,
  EventRow,
  MailRow,
  SnapshotRow,
} from '../engine/ports.js'
import type { CommitRead, StoredReader, Totals } from './reader.js'
import { columnsOfEvent, columnsOfMail, eventOf, mailOf, StoredArrival } from './rows.js'
import { openSnapshot, type StoredSnapshot, snapshotsKept, storeSnapshot } from './states.js'
import type { Column } from './storage.js'

/** Everything of one island. Arrays are indexed by number - 1. */
interface IslandRows {
  readonly arrivals: (ArrivalRow | undefined)[]
  readonly commits: { readonly evaluation: number; digest: Uint8Array | undefined }[]
  lastDigest: Uint8Array
  readonly mail: Map<number, Column[]>
  lastEpoch: number
  readonly confirmations: Map<number, ConfirmationRow[]>
  snapshots: StoredSnapshot[]
}

export class MemoryStore implements StoredReader {
  readonly #islands = new Map<number, IslandRows>()
  readonly #births = new Map<number, BirthRow>()
  readonly #events: Column[][] = []
  #totals = { appends: 0, arrivals: 0, cpuSeconds: 0 }

  /** Stops on rows that do not go on from what is there. */
  checkAppend(rows: Append): void {
    const last = new Map<number, number>()
    for (const { island, commit } of rows.commits) {
      const before = last.get(island) ?? this.#islands.get(island)?.commits.length ?? 0
      check(commit === before + 1, `commits of island ${island} go on from ${before} without a gap`)
      last.set(island, commit)
    }
    for (const { island, epoch } of rows.mail) {
      check(!this.#islands.get(island)?.mail.has(epoch), 'a row of mail is appended once')
    }
  }

  apply(rows: Append): void {
    this.#totals.appends += 1
    for (const row of rows.arrivals) this.#addArrival(row)
    for (const row of rows.confirmations) this.#addConfirmation(row)
    for (const row of rows.births) if (!this.#births.has(row.id)) this.#births.set(row.id, copyBirth(row))
    this.#addCommits(rows.commits)
    for (const row of rows.mail) this.#addMail(row)
    for (const row of rows.events) this.#events.push(columnsOfEvent(this.#events.length + 1, row))
    for (const row of rows.snapshots) this.#addSnapshot(row)
  }

  #addArrival(row: ArrivalRow): void {
    const { island, evaluation, worker, host, processor, attempt, cpuSeconds, result } = row
    this.#totals.arrivals += 1
    this.#totals.cpuSeconds += cpuSeconds
    const failures = result.failures.map((failure) => ({ ...failure }))
    this.#island(island).arrivals[evaluation - 1] = new StoredArrival({
      island,
      evaluation,
      worker,
      host,
      ...(processor === undefined ? {} : { processor }),
      attempt,
      cpuSeconds,
      result: { values: result.values.slice(), failures },
    })
  }

  #addConfirmation(row: ConfirmationRow): void {
    const { confirmations } = this.#island(row.island)
    const copy = { ...row, digest: row.digest.slice() }
    const list = confirmations.get(row.evaluation)
    if (list) list.push(copy)
    else confirmations.set(row.evaluation, [copy])
  }

  /** As in the database, only the last commit of an island in an append keeps its digest. */
  #addCommits(rows: readonly CommitRow[]): void {
    const last = new Map<number, CommitRow>()
    for (const row of rows) {
      this.#island(row.island).commits.push({ evaluation: row.evaluation, digest: undefined })
      last.set(row.island, row)
    }
    for (const [island, row] of last) {
      check(row.digest !== undefined, 'the last commit of an append carries its digest')
      const held = this.#island(island)
      held.lastDigest = row.digest.slice()
      held.commits[held.commits.length - 1]!.digest = held.lastDigest
    }
  }

  #addMail(row: MailRow): void {
    const island = this.#island(row.island)
    island.mail.set(row.epoch, columnsOfMail(row))
    island.lastEpoch = Math.max(island.lastEpoch, row.epoch)
  }

  #addSnapshot(row: SnapshotRow): void {
    const island = this.#island(row.island)
    const others = island.snapshots.filter(({ commit }) => commit !== row.commit)
    island.snapshots = [...others, storeSnapshot(row)]
      .sort((a, b) => b.commit - a.commit)
      .slice(0, snapshotsKept)
  }

  damageSnapshot(island: number, commit: number): void {
    const found = this.#island(island).snapshots.find((snapshot) => snapshot.commit === commit)
    check(found !== undefined, 'a snapshot that is damaged on purpose is there')
    found.state[found.state.length >> 1]! ^= 1
  }

  #island(number: number): IslandRows {
    let island = this.#islands.get(number)
    if (!island) {
      island = {
        arrivals: [],
        commits: [],
        lastDigest: emptyChain,
        mail: new Map(),
        lastEpoch: 0,
        confirmations: new Map(),
        snapshots: [],
      }
      this.#islands.set(number, island)
    }
    return island
  }

  snapshot(island: number, atMost = Number.MAX_SAFE_INTEGER): SnapshotRow | undefined {
    for (const stored of this.#islands.get(island)?.snapshots ?? []) {
      const snapshot = stored.commit <= atMost ? openSnapshot(stored) : undefined
      if (snapshot) return snapshot
    }
    return undefined
  }

  *commits(island: number, after: number): Iterable<CommitRead> {
    const { commits } = this.#islands.get(island) ?? { commits: [] }
    for (let i = after; i < commits.length; i++) {
      const { evaluation, digest } = commits[i]!
      yield digest ? { commit: i + 1, evaluation, digest: digest.slice() } : { commit: i + 1, evaluation }
    }
  }

  lastCommit(island: number): { readonly commit: number; readonly digest: Uint8Array } | undefined {
    const held = this.#islands.get(island)
    if (!held || held.commits.length === 0) return undefined
    return { commit: held.commits.length, digest: held.lastDigest.slice() }
  }

  arrival(island: number, evaluation: number): ArrivalRow | undefined {
    return this.#islands.get(island)?.arrivals[evaluation - 1]
  }

  *arrivals(island: number, fromEvaluation = 1): Iterable<ArrivalRow> {
    const { arrivals } = this.#islands.get(island) ?? { arrivals: [] }
    for (let i = fromEvaluation - 1; i < arrivals.length; i++) {
      const row = arrivals[i]
      if (row) yield row
    }
  }

  confirmations(island: number, evaluation: number): readonly ConfirmationRow[] {
    return [...(this.#islands.get(island)?.confirmations.get(evaluation) ?? [])]
  }
  isConfirmed(island: number, evaluation: number): boolean {
    return (
      this.#islands
        .get(island)
        ?.confirmations.get(evaluation)
        ?.some(({ agrees }) => agrees) ?? false
    )
  }

  mail(island: number, epoch: number): MailRow | undefined {
    const columns = this.#islands.get(island)?.mail.get(epoch)
    return columns && mailOf(columns)
  }
  lastMail(island: number): MailRow | undefined {
    const held = this.#islands.get(island)
    return held && this.mail(island, held.lastEpoch)
  }

  *events(): Iterable<EventRow & { readonly sequence: number }> {
    for (const columns of this.#events) yield eventOf(columns)
  }

  *arrivalsOf(worker: string): Iterable<{ readonly island: number; readonly evaluation: number }> {
    for (const island of [...this.#islands.keys()].sort((a, b) => a - b)) {
      for (const row of this.arrivals(island)) {
        if (row.worker === worker) yield { island, evaluation: row.evaluation }
      }
    }
  }

  birth(id: number): BirthRow | undefined {
    const row = this.#births.get(id)
    return row && copyBirth(row)
  }

  islands(): readonly number[] {
    const withCommits = [...this.#islands].filter(([, { commits }]) => commits.length > 0)
    return withCommits.map(([island]) => island).sort((a, b) => a - b)
  }

  totals(): Totals {
    return { ...this.#totals, head: emptyChain, lastMs: 0 }
  }
}

function copyBirth(row: BirthRow): BirthRow {
  return { ...row, parents: [...row.parents], genome: row.genome.slice() }
}
