// The engine: facts in (results, losses, the time), rows and work out. It drives the islands and is the only door
// through which a population changes; what is believed is acceptance.ts, what is in hand works.ts.
//
//   take(facts)  -> islands move as far as they can
//   rows()       -> what that made true, to be made durable in one transaction; then appended()
//   work(count)  -> what to simulate next; asked for only when nothing waits to be made durable
//
// No clock, no I/O, no randomness of its own: a week passes in a test in one line.

import { check } from '../../shared/check.js'
import { nameOf } from '../../shared/ids.js'
import type { DispatchFact, WorkItem } from '../../shared/result.js'
import type { Island } from '../evolution/island.js'
import type { IslandPlan } from '../evolution/plan.js'
import type { Mail } from '../evolution/post.js'
import type { Gate, Outcome, Search, Standing } from '../evolution/search.js'
import type { Ticket } from '../evolution/tickets.js'
import type { Individual } from '../evolution/types.js'
import { Acceptance } from './acceptance.js'
import { type EngineCounts, newCounts } from './counts.js'
import { Hedges } from './hedges.js'
import { Orders } from './orders.js'
import type { Append, RecordReader } from './ports.js'
import { eventRow, Rows } from './rows.js'
import { targetReached } from './targets.js'
import { Trust } from './trust.js'
import { blame, isNeeded, newWork, type Work, Works } from './works.js'
import type { Schedule, WorldFact } from './world-facts.js'

export interface EngineOptions {
  /** How long an item may go without an answer before it is sent again; Infinity where the dispatcher always answers. */
  readonly leaseMs: number
  /** Simulations over all islands after which the search rests; each island goes as far as its part allows. */
  readonly stopAfter?: number
  /** How long a difference that no machine left can settle is waited for, or a class of processors; 10 minutes. */
  readonly patienceMs?: number
  /** Work is sent a second time after so long at the least; 2 s. */
  readonly hedgeLeastMs?: number
  /** Commits of an island between two snapshots. */
  readonly snapshotCommits: number
}

export interface NotUsed {
  readonly hosts: readonly string[]
  readonly workers: readonly string[]
  readonly pinned?: string
}

export class Engine implements Gate {
  readonly search: Search
  readonly counts: EngineCounts = newCounts()
  readonly #works = new Works()
  readonly #trust = new Trust()
  readonly #hedges: Hedges
  readonly #rows: Rows
  readonly #orders: Orders
  readonly #acceptance: Acceptance
  readonly #options: EngineOptions
  readonly #standing = new Map<number, Standing>()
  /** Islands that may be able to move. */
  readonly #due = new Set<number>()
  #stopQuotas: ReadonlyMap<number, number> | undefined
  readonly #lastSnapshot = new Map<number, number>()
  #commitsSinceForgetting = 0
  #saidOverBudget = false
  #saidNobodyLeft = false
  /** Nobody can move and everything to be reported is confirmed. */
  #settled = false

  /** Made by recover.ts, which has brought `search` to where the record stands. */
  constructor(search: Search, schedule: Schedule, reader: RecordReader, options: EngineOptions) {
    this.search = search
    this.#options = options
    this.#rows = new Rows(search.plan)
    this.#stopQuotas = this.#stopQuotasOf(options.stopAfter)
    const wake = (island: number) => this.#wake(island)
    const standing = (island: number) => this.#standing.get(island)
    const parts = { search, schedule, reader, rows: this.#rows, standing, wake }
    this.#orders = new Orders(parts)
    this.#acceptance = new Acceptance({
      ...parts,
      works: this.#works,
      orders: this.#orders,
      counts: this.counts,
      trust: this.#trust,
      patienceMs: options.patienceMs ?? 600_000,
    })
    this.#hedges = new Hedges(search, this.#works, this.counts, options.hedgeLeastMs ?? 2_000)
    for (const island of search.islands) this.#takeUp(island)
  }

  #takeUp(island: Island): void {
    this.#due.add(island.number)
    // What was derived again counts: where every life is short, replays would grow with the search.
    this.#lastSnapshot.set(island.number, this.search.commitsRestored(island.number))
    for (const ticket of island.outstanding()) {
      const work = this.#addWork(island, ticket)
      if (!this.#acceptance.resume(work)) this.#works.want(work, 'evaluate')
    }
  }

  #stopQuotasOf(stopAfter: number | undefined): ReadonlyMap<number, number> | undefined {
    return stopAfter === undefined ? undefined : this.search.quotas(stopAfter)
  }

  #addWork(island: Island, ticket: Ticket): Work {
    const work = newWork({
      island: island.number,
      evaluation: ticket.evaluation,
      individual: ticket.individual.id,
      firstReplicate: ticket.firstReplicate,
      replicates: ticket.replicates,
      simulations: ticket.simulations,
      expectedCost: ticket.expectedCost,
      genome: ticket.genome,
      kind: 'first',
    })
    this.#works.add(work)
    return work
  }

  #wake(island: number): void {
    if (island > 0) this.#due.add(island)
    else
      for (const [number, standing] of this.#standing) if (standing === 'confirmation') this.#due.add(number)
  }

  // ------------------------------------------------------------------------------------- the world

  /** Takes facts in and moves every island that can move. */
  take(facts: readonly DispatchFact[], nowMs: number): void {
    check(this.#rows.isEmpty, 'rows are made durable before more facts are taken in')
    this.#acceptance.lookAtSuspects()
    for (const fact of facts) this.#takeFact(fact, nowMs)
    this.#acceptance.look(nowMs)
    if (this.#options.leaseMs < Number.POSITIVE_INFINITY) this.#sendOverdueAgain(nowMs)
    this.#advance()
    this.#settled = !this.#moves() && this.#confirmBests()
    if (this.#trust.byHost) this.#hedges.look(nowMs)
    this.#sayOverBudget()
    this.#sayNobodyLeft()
  }

  #takeFact(fact: DispatchFact, nowMs: number): void {
    if (fact.kind === 'fleet') {
      this.#trust.takeFleet(fact.hosts)
      return
    }
    const work = this.#works.find(fact.item.island, fact.item.evaluation)
    if (work && fact.kind === 'result' && this.#trust.known) this.#hedges.note(work, fact, nowMs)
    if (fact.kind === 'lost') {
      if (work) this.#takeLoss(work, fact, nowMs)
    } else if (work) this.#acceptance.take(work, fact)
    else this.#acceptance.takeLate(fact)
  }

  #takeLoss(work: Work, fact: Extract<DispatchFact, { kind: 'lost' }>, nowMs: number): void {
    const { attempt, purpose, isolation } = fact.item
    const lane = work[purpose]
    const isUnderWay = lane.attempt === attempt || (lane.earlier > 0 && lane.earlier === attempt)
    if (!isUnderWay || lane.state !== 'submitted') return
    this.counts.losses++
    if (isNeeded(work, purpose) && blame(work, fact.cause, isolation) === 'set-aside') {
      this.#works.settle(work, purpose)
      this.#acceptance.setAside(work, fact)
      return
    }
    // Of two that run side by side the other goes on.
    if (this.#works.dropTry(work, purpose, attempt)) return
    this.#works.settle(work, purpose)
    if (!isNeeded(work, purpose)) return
    // Where it may run is known better when the machines have changed: not at once again and again.
    if (fact.cause === 'handed-back' && this.#trust.known) this.#works.putOff(work, purpose, nowMs)
    this.#works.want(work, purpose)
  }

  #sendOverdueAgain(nowMs: number): void {
    for (const { work, purpose } of this.#works.overdue(nowMs)) {
      this.#works.settle(work, purpose)
      if (!isNeeded(work, purpose)) continue
      this.counts.resent++
      this.#works.want(work, purpose)
    }
  }

  /** What became true since the last call, or undefined when nothing did. Stays until appended(). */
  rows(): Append | undefined {
    return this.#rows.isEmpty ? undefined : this.#rows.append()
  }

  appended(): void {
    this.#rows.clear()
    if (this.#commitsSinceForgetting < forgetEveryCommits) return
    this.#commitsSinceForgetting = 0
    this.search.forgetOldMail()
  }

  /** The next items to simulate, at most `count`. */
  work(count: number, nowMs: number): WorkItem[] {
    check(this.#rows.isEmpty, 'nothing is sent out before what it follows from is durable')
    // Everything that there is to be used is gone: what is handed out would only come back.
    if (this.#trust.known && this.#trust.usable.length === 0) return []
    const items = this.#works.take(count, nowMs, this.#options.leaseMs, (work, purpose) =>
      this.#mayRun(work) ? this.#acceptance.whereFor(work, purpose) : undefined,
    )
    for (const item of items) if (item.purpose === 'confirm') this.#noteSecond(item)
    return items
  }

  #noteSecond({ island, evaluation, hedge }: WorkItem): void {
    const work = hedge ? undefined : this.#works.find(island, evaluation)
    if (work) this.#acceptance.noteSecond(work)
  }

  /** Machines and processes whose results are not used, and the class of processors the search is pinned to. */
  get notUsed(): NotUsed {
    const { shutOutHosts, shutOutWorkers, pinned } = this.#trust
    return {
      hosts: [...shutOutHosts],
      workers: [...shutOutWorkers],
      ...(pinned === undefined ? {} : { pinned }),
    }
  }

  /** A sentence for the record that changes nothing in the search, with a JSON value that a later start may read. */
  note(kind: string, sentence: string, data: unknown = null): void {
    this.#rows.event(eventRow({ kind, sentence, data }))
  }

  /** Orders a budget for all islands so far; those that have ended go on where it gives them more. */
  orderBudget(sentence: string, simulations: number): void {
    this.search.noteBudget(simulations)
    const islands = this.search.islandPlans.length
    this.orderAtEpoch('budget-changed', sentence, (epoch, island) => ({
      fact: 'budget',
      simulations,
      islands,
      epoch,
      silentFrom: island.ended ? island.counters.epochsPassed + 1 : 0,
    }))
    this.#stopQuotas = this.#stopQuotasOf(this.#options.stopAfter)
  }

  /** Orders a fact for the end of the first epoch that no island has passed. */
  orderAtEpoch(kind: string, sentence: string, make: (epoch: number, island: Island) => WorldFact): void {
    this.#orders.atEpoch(kind, sentence, make)
  }

  /** Orders who takes part after the first epoch that no island has passed: others are paused, new ones added. */
  orderMembership(sentence: string, active: readonly number[], added: readonly IslandPlan[]): void {
    for (const island of this.#orders.membership(sentence, active, added)) this.#takeUp(island)
    this.#stopQuotas = this.#stopQuotasOf(this.#options.stopAfter)
  }

  // ------------------------------------------------------------------------------------- the islands

  #advance(): void {
    for (let number = firstOf(this.#due); number !== undefined; number = firstOf(this.#due)) {
      this.#due.delete(number)
      const island = this.search.island(number)
      this.#standing.set(number, this.search.advance(island, this))
    }
    // Only now: a snapshot shares memory with its island, and an island may have been woken more than once.
    for (const island of this.search.islands) {
      const last = this.#lastSnapshot.get(island.number) ?? 0
      if (island.counters.commits - last >= this.#options.snapshotCommits) this.snapshot(island)
    }
  }

  #moves(): boolean {
    for (const standing of this.#standing.values()) {
      if (standing === 'result' || standing === 'confirmation') return true
    }
    return this.#standing.size < this.search.islands.length
  }

  /** What will be reported is confirmed before the search says that it stands still. */
  #confirmBests(): boolean {
    return this.search.islands
      .flatMap((island) => island.best ?? [])
      .filter((best) => best.failedSimulations === 0)
      .map((best) => this.#acceptance.confirmed.isConfirmed(best))
      .every(Boolean)
  }

  /** Confirming bests has a budget; when it is not enough that is said once, and nothing is left unconfirmed for it. */
  #sayOverBudget(): void {
    const { bestChecks, results } = this.counts
    if (this.#saidOverBudget || results < bestBudgetFrom || bestChecks <= bestBudget * results) return
    this.#saidOverBudget = true
    const sentence = `Confirming would-be bests and emigrants took ${bestChecks} of ${results} simulations so far, more than ${bestBudget * 100} %: nothing is used or reported unconfirmed for that.`
    this.note('bests-over-budget', sentence)
  }

  /** Machines are there and none may be used: the search waits for others, and says so once. */
  #sayNobodyLeft(): void {
    const isSo = this.#trust.known && this.#trust.hosts.length > 0 && this.#trust.usable.length === 0
    if (isSo && !this.#saidNobodyLeft) {
      const sentence = `${this.#trust.hosts.length} machines are there, but all are shut out or of another processor class: the search waits for others. Start a worker elsewhere.`
      this.note('no-usable-machine', sentence)
    }
    this.#saidNobodyLeft = isSo
  }

  /** Puts the island's whole state among the rows. */
  snapshot(island: Island): void {
    this.#lastSnapshot.set(island.number, island.counters.commits)
    this.#rows.snapshot(island)
    this.#acceptance.confirmed.prune()
  }

  snapshotAll(): void {
    for (const island of this.search.islands) {
      if (island.counters.commits > (this.#lastSnapshot.get(island.number) ?? 0)) this.snapshot(island)
    }
  }

  // -------------------------------------------------------------- the world as the islands see it (Gate)

  outcome(island: Island, ticket: Ticket): Outcome | undefined {
    return this.#acceptance.outcome(island, ticket)
  }

  nextArrival(island: Island): number | undefined {
    return this.#acceptance.nextArrival(island)
  }

  mayCommit(island: Island, ticket: Ticket): boolean {
    const quota = this.#stopQuotas?.get(island.number)
    return quota === undefined || island.counters.committedSimulations + ticket.simulations <= quota
  }

  /** With --stop-after, work that will not be committed before the rest is not begun where that is known. */
  #mayRun(work: Work): boolean {
    const quota = this.#stopQuotas?.get(work.island)
    if (quota === undefined || work.kind === 'again') return true
    const island = this.search.island(work.island)
    if (island.tools.island.order !== 'proposal') return island.counters.committedSimulations < quota
    const ticket = island.ticket(work.evaluation)
    return ticket !== undefined && ticket.simulationsBefore + ticket.simulations <= quota
  }

  maySend(_island: Island, _epoch: number, emigrants: readonly Individual[]): boolean {
    // Every emigrant is asked about, so that missing confirmations run side by side.
    return emigrants.map((emigrant) => this.#acceptance.confirmed.isConfirmed(emigrant)).every(Boolean)
  }

  released(island: Island, tickets: readonly Ticket[]): void {
    for (const ticket of tickets) {
      // An island that ended and goes on at once hands out again what is still in hand.
      if (this.#works.find(island.number, ticket.evaluation)) continue
      this.#works.want(this.#addWork(island, ticket), 'evaluate')
    }
  }

  committed(island: Island, ticket: Ticket): void {
    const work = this.#works.find(island.number, ticket.evaluation)
    check(work !== undefined, 'what is committed was in hand')
    this.#acceptance.committed(work)
    this.#rows.commit(island, ticket)
    this.#commitsSinceForgetting++
    if (this.search.plan.budget.target !== undefined) this.#announceTarget(island, ticket)
  }

  #announceTarget(island: Island, ticket: Ticket): void {
    if (island.isControl || ticket.individual !== island.best || !targetReached(this.search.plan, island))
      return
    const { island: whom, epoch } = this.search.finishEpochAfterTarget(island)
    const sentence = `${nameOf(ticket.individual.id)} reached the target; the search finishes with epoch ${epoch}.`
    const fact: WorldFact = { fact: 'finish', epoch }
    for (const one of this.search.islands) {
      if (one.isControl || (whom !== 0 && one !== island)) continue
      this.#orders.at(one, 'target-reached', false, sentence, { stage: 'epoch', at: epoch, fact })
    }
  }

  sent(mail: Mail): void {
    this.#rows.mail(mail)
    this.#wakeWhoWaitsForMail()
  }
  #wakeWhoWaitsForMail(): void {
    for (const [number, standing] of this.#standing) if (standing === 'mail') this.#due.add(number)
  }

  factWhileWaiting(island: Island): boolean {
    if (this.#orders.enterNext(island, 'waiting', island.counters.commits)) {
      // Whoever waited for the mail of an island that goes on later waits no more.
      this.#wakeWhoWaitsForMail()
      return true
    }
    if (!island.ended) return false
    if (this.#orders.stateAgain(island)) return this.factWhileWaiting(island)
    this.#dropWorkOf(island)
    return false
  }
  /** An ended island's unfinished work is of no use any more. */
  #dropWorkOf(island: Island): void {
    for (const work of this.#works.of(island.number)) if (work.kind === 'first') this.#works.forget(work)
  }
  factsBeforeSending(island: Island, epoch: number): void {
    this.#orders.enterAll(island, 'sending', epoch)
  }
  factsAtEpoch(island: Island, epoch: number): void {
    this.#orders.enterAll(island, 'epoch', epoch)
    this.#rows.epoch(island)
  }

  // ---------------------------------------------------------------------------------------- for people

  /** 'finished' when all islands have ended, 'rested' when none can go on before more is allowed. */
  status(): 'running' | 'rested' | 'finished' {
    if (!this.#settled) return 'running'
    return this.search.islands.every((island) => island.ended || island.paused) ? 'finished' : 'rested'
  }

  standing(island: number): Standing | undefined {
    return this.#standing.get(island)
  }

  /** Which kinds of facts of the world have changed this search: empty for a pure one. */
  impurities(): readonly string[] {
    return this.#orders.impurities()
  }

  get inHand(): { readonly waiting: number; readonly submitted: number } {
    return { waiting: this.#works.waiting, submitted: this.#works.submitted }
  }
}

const forgetEveryCommits = 1000
/** Part of all simulations that confirming bests should take at most, and after how many it is judged. */
const bestBudget = 0.01
const bestBudgetFrom = 5_000

function firstOf(numbers: ReadonlySet<number>): number | undefined {
  for (const number of numbers) return number
  return undefined
}
