// A ticket is one evaluation an island has proposed and not yet committed, and the rule that says which ticket
// is committed next. The orders are those of a known, repeatable world; 'arrival' alone is not, and is
// journalled by who decides it.
//
//   proposal   in the order of proposal
//   cost       the order of a virtual cluster of L slots: a ticket starts at the virtual time of the commit that
//              released it and finishes one expected cost later; founders first, then (finish, evaluation)
//   arrival    as results are accepted

import type { Individual } from './types.js'

export interface Ticket {
  /** 1, 2, ... in order of proposal on its island. */
  readonly evaluation: number
  readonly individual: Individual
  /** Canonical bytes of its genome, made once: for the work that travels and for the digest. */
  readonly genome: Uint8Array
  readonly firstReplicate: number
  readonly replicates: number
  readonly simulations: number
  /** Simulations this island had proposed before this ticket. */
  readonly simulationsBefore: number
  readonly expectedCost: number
  readonly virtualFinish: number
  readonly founder: boolean
}

/** True when `a` is committed before `b` on a virtual cluster. Total: ends with the evaluation's number. */
export function finishesFirst(a: Ticket, b: Ticket): boolean {
  if (a.founder !== b.founder) return a.founder
  if (a.virtualFinish !== b.virtualFinish) return a.virtualFinish < b.virtualFinish
  return a.evaluation < b.evaluation
}

/** Outstanding tickets of one island, in order of proposal. */
export class Outstanding {
  // A ring would save the shift; at lookaheads of a few hundred the shift costs less than the bookkeeping.
  readonly #tickets: Ticket[]

  constructor(tickets: readonly Ticket[] = []) {
    this.#tickets = [...tickets]
  }

  get size(): number {
    return this.#tickets.length
  }

  all(): readonly Ticket[] {
    return this.#tickets
  }

  add(ticket: Ticket): void {
    this.#tickets.push(ticket)
  }

  find(evaluation: number): Ticket | undefined {
    // Mostly they follow one another without a gap.
    const guess = this.#tickets[evaluation - (this.#tickets[0]?.evaluation ?? 0)]
    if (guess?.evaluation === evaluation) return guess
    return this.#tickets.find((ticket) => ticket.evaluation === evaluation)
  }

  remove(ticket: Ticket): void {
    if (this.#tickets[0] === ticket) this.#tickets.shift()
    else this.#tickets.splice(this.#tickets.indexOf(ticket), 1)
  }

  oldest(): Ticket | undefined {
    return this.#tickets[0]
  }

  firstToFinish(): Ticket | undefined {
    let first = this.#tickets[0]
    for (const ticket of this.#tickets) if (first && finishesFirst(ticket, first)) first = ticket
    return first
  }

  clear(): void {
    this.#tickets.length = 0
  }
}
