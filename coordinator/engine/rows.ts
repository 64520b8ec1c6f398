// Rows that became true since the last transaction, and which births are kept under the plan's policy.

import type { Island } from '../evolution/island.js'
import type { SearchPlan } from '../evolution/plan.js'
import type { Mail } from '../evolution/post.js'
import type { Ticket } from '../evolution/tickets.js'
import type { Individual } from '../evolution/types.js'
import type {
  Append,
  ArrivalRow,
  BirthRow,
  CommitRow,
  ConfirmationRow,
  EventRow,
  MailRow,
  SnapshotRow,
} from './ports.js'

export class Rows {
  readonly #policy: SearchPlan['genomes']
  #arrivals: ArrivalRow[] = []
  #confirmations: ConfirmationRow[] = []
  #births: BirthRow[] = []
  #commits: CommitRow[] = []
  readonly #committing = new Map<number, Island>()
  #mail: MailRow[] = []
  #events: EventRow[] = []
  #snapshots: SnapshotRow[] = []
  #count = 0
  /** Policy 'survivors': who of the living is in the record already. */
  readonly #kept = new Map<number, Set<number>>()

  constructor(plan: SearchPlan) {
    this.#policy = plan.genomes
  }

  get isEmpty(): boolean {
    return this.#count === 0
  }

  append(): Append {
    // Only the last commit of an island in a transaction needs its digest: nobody works out the others.
    for (const island of this.#committing.values()) {
      const last = this.#commits.findLastIndex((row) => row.island === island.number)
      this.#commits[last] = { ...this.#commits[last]!, digest: island.commitDigest }
    }
    this.#committing.clear()
    return {
      arrivals: this.#arrivals,
      confirmations: this.#confirmations,
      births: this.#births,
      commits: this.#commits,
      mail: this.#mail,
      events: this.#events,
      snapshots: this.#snapshots,
    }
  }

  clear(): void {
    this.#arrivals = []
    this.#confirmations = []
    this.#births = []
    this.#commits = []
    this.#mail = []
    this.#events = []
    this.#snapshots = []
    this.#count = 0
  }

  arrival(row: ArrivalRow): void {
    this.#count++
    this.#arrivals.push(row)
  }
  findArrival(island: number, evaluation: number): ArrivalRow | undefined {
    return this.#arrivals.findLast((row) => row.island === island && row.evaluation === evaluation)
  }
  confirmation(row: ConfirmationRow): void {
    this.#count++
    this.#confirmations.push(row)
  }
  event(row: EventRow): void {
    this.#count++
    this.#events.push(row)
  }
  mail(mail: Mail): void {
    this.#count++
    this.#mail.push(mail)
  }

  commit(island: Island, ticket: Ticket): void {
    this.#count++
    this.#commits.push({
      island: island.number,
      commit: island.counters.commits,
      evaluation: ticket.evaluation,
    })
    this.#committing.set(island.number, island)
    if (this.#policy === 'all' && ticket.firstReplicate === 0) this.#birth(island, ticket.individual)
  }

  snapshot(island: Island): void {
    this.#count++
    this.#snapshots.push({
      island: island.number,
      commit: island.counters.commits,
      digest: island.digest,
      state: island.save(),
    })
    this.epoch(island)
  }

  /** Policy 'survivors': whoever is alive at the end of an epoch or at a snapshot is kept. */
  epoch(island: Island): void {
    if (this.#policy !== 'survivors') return
    const before = this.#kept.get(island.number) ?? new Set<number>()
    const now = new Set<number>()
    for (const individual of [...island.members(), ...(island.best ? [island.best] : [])]) {
      if (!before.has(individual.id) && !now.has(individual.id)) this.#birth(island, individual)
      now.add(individual.id)
    }
    this.#kept.set(island.number, now)
  }

  #birth(island: Island, individual: Individual): void {
    this.#count++
    this.#births.push({
      id: individual.id,
      parents: individual.parents,
      origin: individual.origin,
      atCommit: individual.bornAtCommit,
      genome: island.bytesOf(individual.genome),
    })
  }
}

/** An event with the fields that most events leave at nothing. */
export function eventRow(of: Pick<EventRow, 'kind' | 'sentence'> & Partial<EventRow>): EventRow {
  return { island: 0, atCommit: 0, epoch: 0, changesSearch: false, data: null, ...of }
}
