// A record in memory on a simulated disk. An append is durable when it returns; a crash in the middle of one leaves
// it whole or absent (what a transaction promises), and a snapshot written last may be torn and must be skipped.

import type {
  Append,
  ArrivalRow,
  BirthRow,
  CommitRow,
  ConfirmationRow,
  EventRow,
  Journal,
  MailRow,
  RecordReader,
  SnapshotRow,
} from '../../coordinator/engine/ports.js'
import type { Stream } from '../../shared/streams.js'

export class PowerCut extends Error {}
/** Another writer has taken over. */
export class Fenced extends Error {}
export class StorageFault extends Error {}

export class Disk implements Journal, RecordReader {
  readonly #arrivals = new Map<string, ArrivalRow>()
  readonly #commits = new Map<number, CommitRow[]>()
  readonly #mail = new Map<string, MailRow>()
  readonly #lastMail = new Map<number, MailRow>()
  readonly #events: (EventRow & { sequence: number })[] = []
  readonly #confirmations = new Map<string, ConfirmationRow[]>()
  readonly #births = new Map<number, BirthRow>()
  readonly #snapshots = new Map<number, SnapshotRow[]>()
  readonly #draw: Stream
  /** Chance in 1000 that an append is cut off by a crash. */
  cutsPerThousand = 0
  /** Fails this call and, when `forEver`, all after it; counted over the life of the disk. */
  failAt: { readonly call: number; readonly forEver: boolean; readonly after: boolean } | undefined
  calls = 0
  #writer = 0

  constructor(draw: Stream) {
    this.#draw = draw
  }

  /** The write side from now on; every earlier one is fenced. */
  takeOver(): Journal {
    const token = ++this.#writer
    return {
      append: (rows) => {
        if (token !== this.#writer) throw new Fenced('another coordinator has taken over')
        this.append(rows)
      },
    }
  }

  append(rows: Append): void {
    this.calls++
    const fault = this.failAt
    const fails = fault && (fault.forEver ? this.calls >= fault.call : this.calls === fault.call)
    if (fails && !fault.after) throw new StorageFault('the disk refused')
    if (this.cutsPerThousand > 0 && this.#draw.chance(this.cutsPerThousand, 1000)) {
      if (this.#draw.chance(1, 2)) this.#write(rows, this.#draw.chance(1, 3))
      throw new PowerCut('the power went')
    }
    this.#write(rows, false)
    if (fails) throw new StorageFault('the disk wrote and then failed')
  }

  #write(rows: Append, tornSnapshots: boolean): void {
    for (const row of rows.arrivals) this.#arrivals.set(`${row.island} ${row.evaluation}`, row)
    for (const row of rows.confirmations) {
      const key = `${row.island} ${row.evaluation}`
      this.#confirmations.set(key, [...(this.#confirmations.get(key) ?? []), row])
    }
    for (const row of rows.births) this.#births.set(row.id, row)
    for (const { island, commit, evaluation, digest } of rows.commits) {
      const journal = this.#commits.get(island) ?? []
      if (commit !== journal.length + 1) throw new Error(`commit ${commit} does not follow ${journal.length}`)
      journal.push(digest ? { island, commit, evaluation, digest } : { island, commit, evaluation })
      this.#commits.set(island, journal)
    }
    for (const row of rows.mail) {
      // What is on a disk does not change when its writer's memory does (arrays are replaced, never written to).
      const copy = copyOf(row)
      this.#mail.set(`${row.island} ${row.epoch}`, copy)
      this.#lastMail.set(row.island, copy)
    }
    for (const row of rows.events) this.#events.push({ ...row, sequence: this.#events.length + 1 })
    if (tornSnapshots) return
    for (const row of rows.snapshots) {
      this.#snapshots.set(
        row.island,
        [structuredClone(row), ...(this.#snapshots.get(row.island) ?? [])].slice(0, 2),
      )
    }
  }

  snapshot(island: number): SnapshotRow | undefined {
    return structuredClone(this.#snapshots.get(island)?.[0])
  }
  *commits(island: number, after: number): Iterable<CommitRow> {
    yield* (this.#commits.get(island) ?? []).slice(after)
  }
  lastCommit(island: number): { commit: number; digest: Uint8Array } | undefined {
    const last = this.#commits.get(island)?.at(-1)
    return last?.digest && { commit: last.commit, digest: last.digest }
  }
  arrival(island: number, evaluation: number): ArrivalRow | undefined {
    return this.#arrivals.get(`${island} ${evaluation}`)
  }
  mail(island: number, epoch: number): MailRow | undefined {
    return copyOf(this.#mail.get(`${island} ${epoch}`))
  }
  lastMail(island: number): MailRow | undefined {
    return copyOf(this.#lastMail.get(island))
  }
  events(): Iterable<EventRow & { sequence: number }> {
    return this.#events
  }
  isConfirmed(island: number, evaluation: number): boolean {
    return this.confirmations(island, evaluation).some(({ agrees }) => agrees)
  }
  confirmations(island: number, evaluation: number): readonly ConfirmationRow[] {
    return this.#confirmations.get(`${island} ${evaluation}`) ?? []
  }
  *arrivalsOf(worker: string): Iterable<{ island: number; evaluation: number }> {
    for (const row of this.#arrivals.values()) if (row.worker === worker) yield row
  }
  birth(id: number): BirthRow | undefined {
    return this.#births.get(id)
  }
  totals(): { arrivals: number; cpuSeconds: number } {
    return { arrivals: this.#arrivals.size, cpuSeconds: 0 }
  }
}

function copyOf<Row extends MailRow | undefined>(row: Row): Row {
  return row && { ...row, emigrants: row.emigrants.map((emigrant) => ({ ...emigrant })) }
}
