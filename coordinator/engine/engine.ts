// The engine: facts in (results, losses, the time), rows and work out. It owns what is in hand, decides what is
// believed and drives the islands; it is the only door through which a population changes.
//
//   take(facts)  -> islands move as far as they can
//   rows()       -> what that made true, to be made durable in one transaction; then appended()
//   work(count)  -> what to simulate next; asked for only when nothing waits to be made durable
//
// No clock, no I/O, no randomness of its own: a week passes in a test in one line.

import { z } from 'zod'
import { check } from '../../shared/check.js'
import { resultDigest } from '../../shared/digests.js'
import { islandName, nameOf } from '../../shared/ids.js'
import { limits } from '../../shared/limits.js'
import { refuse } from '../../shared/refusals.js'
import type { DispatchFact, EvaluationResult, WorkItem } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { columnsOf } from '../evolution/estimate.js'
import type { Island } from '../evolution/island.js'
import {
  type Gate,
  type Mail,
  type Outcome,
  quotasOf,
  type Search,
  type Standing,
} from '../evolution/search.js'
import type { Ticket } from '../evolution/tickets.js'
import type { Block, Individual } from '../evolution/types.js'
import type { Append, EventRow, RecordReader } from './ports.js'
import { Rows } from './rows.js'
import { targetReached } from './targets.js'
import { answersOf, answersTolerated, sameBytes, type Vote, verdictOf } from './votes.js'
import { blame, newWork, type Purpose, type Work, Works } from './works.js'
import { apply, type FactData, Schedule, type WorldFact } from './world-facts.js'

export interface EngineOptions {
  /** How long a submitted item may go without an answer before it is sent again; Infinity where the dispatcher always answers. */
  readonly leaseMs: number
  /** Simulations over all islands after which the search rests; each island goes as far as its part allows. */
  readonly stopAfter?: number
  /** Commits of an island between two snapshots. */
  readonly snapshotCommits: number
}

/** Counters for people and metrics; none of them changes the search. */
export interface EngineCounts {
  results: number
  duplicates: number
  late: number
  losses: number
  setAside: number
  confirmations: number
  disagreements: number
  corrections: number
  resent: number
}

export class Engine implements Gate {
  readonly search: Search
  readonly counts: EngineCounts = {
    results: 0,
    duplicates: 0,
    late: 0,
    losses: 0,
    setAside: 0,
    confirmations: 0,
    disagreements: 0,
    corrections: 0,
    resent: 0,
  }
  readonly #works = new Works()
  readonly #rows: Rows
  readonly #schedule: Schedule
  readonly #reader: RecordReader
  readonly #options: EngineOptions
  readonly #standing = new Map<number, Standing>()
  readonly #due = new Set<number>()
  readonly #stopQuotas: ReadonlyMap<number, number> | undefined
  readonly #lastSnapshot = new Map<number, number>()
  /** Committed evaluations of the living that a second worker confirmed. */
  readonly #confirmed = new Set<string>()
  readonly #shutOut = new Set<string>()
  /** Workers whose earlier results are to be looked at again once the record has them all. */
  readonly #suspects: string[] = []
  readonly #arrivalOrder = new Map<number, number[]>()
  readonly #impurities = new Set<string>()
  /** Nobody can move and everything to be reported is confirmed. */
  #settled = false

  /** Made by recover.ts, which has brought `search` to where the record stands. */
  constructor(search: Search, schedule: Schedule, reader: RecordReader, options: EngineOptions) {
    this.search = search
    this.#schedule = schedule
    this.#reader = reader
    this.#options = options
    this.#rows = new Rows(search.plan)
    this.#stopQuotas =
      options.stopAfter === undefined ? undefined : quotasOf(search.plan, options.stopAfter)
    for (const island of search.islands) {
      this.#due.add(island.number)
      this.#lastSnapshot.set(island.number, island.counters.commits)
      if (island.tools.island.order === 'arrival') this.#arrivalOrder.set(island.number, [])
    }
    for (const event of reader.events()) {
      if (event.kind === 'worker-shut-out') this.#shutOut.add(shutOutSchema.parse(event.data).worker)
      if (event.changesSearch) this.#impurities.add(event.kind)
    }
    this.#suspects.push(...this.#shutOut)
    for (const island of search.islands) this.#resumeWork(island)
  }

  #resumeWork(island: Island): void {
    for (const ticket of island.outstanding()) {
      const arrival = this.#reader.arrival(island.number, ticket.evaluation)
      const work = this.#addWork(island, ticket)
      const confirmed = this.#reader.isConfirmed(island.number, ticket.evaluation)
      if (arrival && (confirmed || !this.#shutOut.has(arrival.worker))) {
        const executor = { kind: 'thread', worker: arrival.worker, host: arrival.host } as const
        work.recorded = { result: arrival.result, digest: arrival.digest, executor }
        this.#vote(work, work.recorded, 'evaluate')
        work.confirmed = confirmed || arrival.worker === setAsideWorker
      } else this.#works.want(work, 'evaluate')
    }
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

  // ------------------------------------------------------------------------------------- the world

  /** Takes facts in and moves every island that can move. */
  take(facts: readonly DispatchFact[], nowMs: number): void {
    check(this.#rows.isEmpty, 'rows are made durable before more facts are taken in')
    this.#lookAtSuspects()
    for (const fact of facts) {
      if (fact.kind === 'result') this.#takeResult(fact)
      else this.#takeLoss(fact)
    }
    for (const { work, purpose } of this.#works.overdue(nowMs)) {
      this.counts.resent++
      this.#works.settle(work, purpose)
      this.#works.want(work, purpose)
    }
    this.#advance()
    this.#settled = !this.#moves() && this.#confirmBests()
  }

  #moves(): boolean {
    for (const standing of this.#standing.values()) {
      if (standing === 'result' || standing === 'confirmation') return true
    }
    return this.#standing.size < this.search.islands.length
  }

  /** What became true since the last call, or undefined when nothing did. Stays until appended(). */
  rows(): Append | undefined {
    return this.#rows.isEmpty ? undefined : this.#rows.append()
  }

  appended(): void {
    this.#rows.clear()
    if (this.search.islands.every((island) => island.counters.commits % 64 === 0)) this.search.forgetOldMail()
  }

  /** The next items to simulate, at most `count`. */
  work(count: number, nowMs: number): WorkItem[] {
    check(this.#rows.isEmpty, 'nothing is sent out before what it follows from is durable')
    return this.#works.take(count, nowMs + this.#options.leaseMs, (work) => this.#mayRun(work), this.#shutOut)
  }

  /** A sentence for the record that changes nothing in the search. */
  note(kind: string, sentence: string, island = 0): void {
    this.noteData(kind, sentence, null, island)
  }
  /** The same with a JSON value that a later start reads again. */
  noteData(kind: string, sentence: string, data: unknown, island = 0): void {
    this.#rows.event(eventRow(kind, island, 0, 0, false, sentence, data))
  }

  // -------------------------------------------------------------------------------- results, losses

  #takeResult(fact: Extract<DispatchFact, { kind: 'result' }>): void {
    const work = this.#works.find(fact.item.island, fact.item.evaluation)
    if (!work) {
      this.#takeLate(fact)
      return
    }
    if (work.lanes[fact.item.purpose].attempt === fact.item.attempt) this.#works.settle(work, fact.item.purpose)
    if (this.#shutOut.has(fact.executor.worker)) {
      this.counts.late++
      this.#works.want(work, fact.item.purpose)
      return
    }
    check(
      fact.result.values.length === work.simulations * columnsOf(this.search.plan.problem),
      'a dispatcher hands over whole results',
    )
    this.counts.results++
    const vote = { result: fact.result, digest: fact.digest, executor: fact.executor }
    if (!this.#vote(work, vote, fact.item.purpose)) {
      this.counts.duplicates++
      return
    }
    this.#recordVote(work, vote, fact)
    this.#judge(work)
  }

  /** Committed already, or of another search: nothing changes, but a difference is said. */
  #takeLate(fact: Extract<DispatchFact, { kind: 'result' }>): void {
    this.counts.late++
    const known = this.#reader.arrival(fact.item.island, fact.item.evaluation)
    if (!known || sameBytes(known.digest, fact.digest)) return
    this.counts.disagreements++
    this.note(
      'late-result-differs',
      `A late result of evaluation ${fact.item.evaluation} of ${islandName(fact.item.island)} by ${fact.executor.worker} differs from the one that was used, by ${known.worker}.`,
    )
  }

  /** Counts a vote; false when this worker has voted the same already. */
  #vote(work: Work, vote: Vote, purpose: Purpose): boolean {
    const earlier = work.votes.find((other) => other.executor.worker === vote.executor.worker)
    if (earlier) {
      // Whoever contradicts himself is no witness: others must say it.
      const contradicts = !sameBytes(earlier.digest, vote.digest)
      if (contradicts) {
        this.counts.disagreements++
        work.spotCheck = true
      }
      if (purpose === 'confirm' || contradicts) this.#works.want(work, 'confirm')
      return false
    }
    work.votes.push(vote)
    if (work.votes.length === 1 && work.kind === 'first') this.#arrivalOrder.get(work.island)?.push(work.evaluation)
    this.#due.add(work.island)
    return true
  }

  #recordVote(work: Work, vote: Vote, fact: Extract<DispatchFact, { kind: 'result' }>): void {
    if (work.votes.length === 1) {
      this.#keep(work, fact.cpuSeconds)
      return
    }
    this.counts.confirmations++
    const first = work.votes[0]!
    this.#rows.confirmation({
      island: work.island,
      evaluation: work.evaluation,
      worker: vote.executor.worker,
      host: vote.executor.host,
      by: vote.executor.host === first.executor.host ? 'process' : 'host',
      digest: vote.digest,
      agrees: sameBytes(vote.digest, first.digest),
    })
  }

  /** Writes the first vote down where the record does not have it yet. */
  #keep(work: Work, cpuSeconds = 0): void {
    const vote = work.votes[0]
    if (!vote || vote === work.recorded) return
    work.recorded = vote
    this.#rows.arrival({
      island: work.island,
      evaluation: work.evaluation,
      worker: vote.executor.worker,
      host: vote.executor.host,
      attempt: work.lanes.evaluate.attempt,
      cpuSeconds,
      result: vote.result,
      digest: vote.digest,
    })
  }

  /** After a vote: is it settled, does it need another, is somebody wrong? */
  #judge(work: Work): void {
    const verdict = verdictOf(work.votes)
    if (verdict.kind === 'disputed') {
      this.counts.disagreements++
      if (answersOf(work.votes) > answersTolerated) this.#notRepeatable(work, work.votes)
      this.#works.want(work, 'confirm')
      return
    }
    if (verdict.kind === 'confirmed') {
      this.#settleConfirmed(work, verdict.vote, verdict.wrong)
      return
    }
    if (work.kind === 'first' && this.#mustConfirm(this.search.island(work.island), work)) {
      this.#works.want(work, 'confirm')
    }
  }

  #settleConfirmed(work: Work, right: Vote, wrong: readonly Vote[]): void {
    work.confirmed = true
    const recorded = work.votes[0]!
    const overruled = !sameBytes(recorded.digest, right.digest)
    if (overruled && work.kind === 'first') this.#overrule(work, right)
    if (work.kind === 'again') {
      this.#confirmed.add(keyOf(work.island, work.evaluation))
      if (overruled) this.#correct(work, right)
      this.#works.forget(work)
      for (const island of this.search.islands) {
        if (this.#standing.get(island.number) === 'confirmation') this.#due.add(island.number)
      }
    }
    for (const vote of wrong) this.#convict(vote, work)
  }

  /** The first result was wrong and nothing was committed with it: the right one takes its place. */
  #overrule(work: Work, right: Vote): void {
    work.votes = [right, ...work.votes.filter((vote) => vote !== right)]
    this.#keep(work)
  }

  /** A committed result was wrong: every island puts it right at a stated point. */
  #correct(work: Work, right: Vote): void {
    this.counts.corrections++
    const fact: WorldFact = {
      fact: 'amend',
      individual: work.individual,
      firstReplicate: work.firstReplicate,
      result: { values: [...right.result.values], failures: [...right.result.failures] },
    }
    const sentence = `The result of ${nameOf(work.individual)} (evaluation ${work.evaluation} of ${islandName(work.island)}) was wrong and was corrected.`
    for (const island of this.search.islands) this.order(island, 'correction', sentence, fact)
  }

  #convict({ executor }: Vote, work: Work): void {
    if (this.#shutOut.has(executor.worker)) return
    this.#shutOut.add(executor.worker)
    const sentence = `Worker ${executor.worker} on ${executor.host} gave a wrong result for evaluation ${work.evaluation} of ${islandName(work.island)}: two others agree against it. Its results are not used any more.`
    this.#rows.event(eventRow('worker-shut-out', 0, 0, 0, false, sentence, { worker: executor.worker }))
    this.#suspects.push(executor.worker)
    for (const other of this.#works.all()) {
      if (other.kind !== 'first' || other.confirmed) continue
      const left = other.votes.filter((vote) => vote.executor.worker !== executor.worker)
      if (left.length === other.votes.length) continue
      other.votes = left
      this.#keep(other)
      this.#wantMore(other)
    }
  }

  #wantMore(work: Work): void {
    if (work.votes.length === 0) this.#works.want(work, 'evaluate')
    else if (!work.confirmed && verdictOf(work.votes).kind === 'disputed') this.#works.want(work, 'confirm')
  }

  #notRepeatable(work: Work, votes: readonly Vote[]): never {
    throw refuse('not-deterministic', {
      detail: `${nameOf(work.individual)}, replicates ${work.firstReplicate} to ${work.firstReplicate + work.replicates - 1}, gave ${answersOf(votes)} different results in ${votes.length} simulations by ${votes.map((vote) => vote.executor.worker).join(', ')}`,
    })
  }

  #takeLoss(fact: Extract<DispatchFact, { kind: 'lost' }>): void {
    const work = this.#works.find(fact.item.island, fact.item.evaluation)
    if (!work) return
    const lane = work.lanes[fact.item.purpose]
    if (lane.attempt !== fact.item.attempt || lane.state !== 'submitted') return
    this.counts.losses++
    this.#works.settle(work, fact.item.purpose)
    const verdict = blame(work, fact.cause, fact.item.isolation)
    if (verdict === 'again') this.#works.want(work, fact.item.purpose)
    else this.#setAside(work, fact)
  }

  #setAside(work: Work, fact: Extract<DispatchFact, { kind: 'lost' }>): void {
    if (work.votes.length > 0) {
      // It was simulated once and only its confirmation dies: the result stands, unconfirmed, and is marked so.
      work.confirmed = true
      if (work.kind === 'again') {
        this.#confirmed.add(keyOf(work.island, work.evaluation))
        this.#works.forget(work)
      }
      this.note(
        'confirmation-given-up',
        `The confirmation of ${nameOf(work.individual)} died ${limits.attemptsAlone} times (${fact.cause}); its first result stands unconfirmed.`,
        work.island,
      )
      for (const island of this.search.islands) this.#due.add(island.number)
      return
    }
    this.counts.setAside++
    // The same words whatever the deaths were like: the result enters the digest, the event tells the rest.
    const reason = 'set aside after its last try'
    const result: EvaluationResult = {
      values: new Float64Array(work.simulations * columnsOf(this.search.plan.problem)),
      failures: Array.from({ length: work.simulations }, (_, simulation) => ({ simulation, reason })),
    }
    const vote: Vote = {
      result,
      digest: resultDigest(result),
      executor: { kind: 'process', worker: setAsideWorker, host: fact.executor.host },
    }
    this.#vote(work, vote, 'evaluate')
    work.confirmed = true
    this.#keep(work)
    this.#impurities.add('set-aside')
    this.#rows.event(
      eventRow(
        'set-aside',
        work.island,
        this.search.island(work.island).counters.commits,
        0,
        true,
        `${nameOf(work.individual)} was given up after its last try (${fact.cause}). Last words: ${fact.detail.slice(0, limits.lossDetailLength)}`,
        { evaluation: work.evaluation, individual: work.individual, cause: fact.cause },
      ),
    )
  }

  // ------------------------------------------------------------------------------- what is believed

  /** Spot checks chosen by hash, and results that would become the best so far on any objective. */
  #mustConfirm(island: Island, work: Work): boolean {
    if (work.confirmed || work.kind !== 'first') return false
    const { seed, confirm } = this.search.plan
    work.spotCheck ??=
      confirm.fraction > 0 &&
      stream(seed, 'confirm', work.island, work.evaluation).uniform() < confirm.fraction
    if (work.spotCheck) return true
    const ticket = island.ticket(work.evaluation)
    const vote = work.votes[0]
    if (!ticket || !vote) return false
    const score = island.scoreWith(ticket, vote.result)
    for (let objective = 0; objective < score.length; objective++) {
      if (score[objective]! < island.bestScores[objective]!) return true
    }
    return false
  }

  /** True when every result of the individual was confirmed; asks for what is missing. */
  #isConfirmed(individual: Individual): boolean {
    let all = true
    let offset = 0
    for (const block of individual.blocks) {
      const length = (individual.values.length / individual.replicates) * block.replicates
      if (!this.#blockConfirmed(block)) {
        this.#simulateAgain(individual, block, individual.values.slice(offset, offset + length))
        all = false
      }
      offset += length
    }
    return all
  }

  #blockConfirmed(block: Block): boolean {
    const key = keyOf(block.island, block.evaluation)
    if (this.#confirmed.has(key)) return true
    if (!this.#reader.isConfirmed(block.island, block.evaluation)) return false
    this.#confirmed.add(key)
    return true
  }

  #simulateAgain(individual: Individual, block: Block, values: Float64Array): void {
    if (this.#works.find(block.island, block.evaluation)) return
    const island = this.search.island(block.island)
    const recorded =
      this.#rows.findArrival(block.island, block.evaluation) ??
      this.#reader.arrival(block.island, block.evaluation)
    check(recorded !== undefined, 'a committed result is in the record')
    const work = newWork({
      island: block.island,
      evaluation: block.evaluation,
      individual: individual.id,
      firstReplicate: block.firstReplicate,
      replicates: block.replicates,
      simulations: values.length / columnsOf(this.search.plan.problem),
      expectedCost: 1,
      genome: island.bytesOf(individual.genome),
      kind: 'again',
    })
    work.votes.push({
      result: recorded.result,
      digest: recorded.digest,
      executor: { kind: 'thread', worker: recorded.worker, host: recorded.host },
    })
    this.#works.add(work)
    this.#works.want(work, 'confirm')
  }

  /** Looks again at everything alive that a convicted worker has simulated and nobody confirmed. */
  #lookAtSuspects(): void {
    const suspects = new Set(this.#suspects.splice(0))
    if (suspects.size === 0) return
    for (const island of this.search.islands) {
      const alive = [...island.members(), ...(island.best ? [island.best] : [])]
      for (const individual of alive) {
        const suspected = individual.blocks.some((block) => {
          const arrival = this.#reader.arrival(block.island, block.evaluation)
          return arrival !== undefined && suspects.has(arrival.worker)
        })
        if (suspected) this.#isConfirmed(individual)
      }
    }
  }

  // ------------------------------------------------------------------------------------- the islands

  #advance(): void {
    for (let number = first(this.#due); number !== undefined; number = first(this.#due)) {
      this.#due.delete(number)
      const island = this.search.island(number)
      this.#standing.set(number, this.search.advance(island, this))
      const last = this.#lastSnapshot.get(number) ?? 0
      if (island.counters.commits - last >= this.#options.snapshotCommits) this.snapshot(island)
    }
  }

  /** Puts the island's whole state among the rows. */
  snapshot(island: Island): void {
    this.#lastSnapshot.set(island.number, island.counters.commits)
    this.#rows.snapshot(island)
    this.#pruneConfirmed()
  }

  snapshotAll(): void {
    for (const island of this.search.islands) {
      if (island.counters.commits > (this.#lastSnapshot.get(island.number) ?? 0)) this.snapshot(island)
    }
  }

  /** Confirmations of the dead are in the record; memory keeps those of the living. */
  #pruneConfirmed(): void {
    if (this.#confirmed.size < limits.confirmedInMemory) return
    this.#confirmed.clear()
  }

  outcome(island: Island, ticket: Ticket): Outcome | undefined {
    const work = this.#works.find(island.number, ticket.evaluation)
    const vote = work?.votes[0]
    if (!work || !vote || (work.votes.length > 1 && !work.confirmed)) return undefined
    if (this.#mustConfirm(island, work)) {
      this.#works.want(work, 'confirm')
      return undefined
    }
    return { result: vote.result, digest: vote.digest }
  }

  nextArrival(island: Island): number | undefined {
    const order = this.#arrivalOrder.get(island.number) ?? []
    return order.find((evaluation) => {
      const ticket = island.ticket(evaluation)
      return ticket !== undefined && this.outcome(island, ticket) !== undefined
    })
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
    return emigrants.map((emigrant) => this.#isConfirmed(emigrant)).every(Boolean)
  }

  released(island: Island, tickets: readonly Ticket[]): void {
    for (const ticket of tickets) this.#works.want(this.#addWork(island, ticket), 'evaluate')
  }

  committed(island: Island, ticket: Ticket, _outcome: Outcome): void {
    const work = this.#works.find(island.number, ticket.evaluation)
    check(work !== undefined && work.recorded === work.votes[0], 'what is committed is what the record holds')
    if (work.confirmed) this.#confirmed.add(keyOf(work.island, work.evaluation))
    this.#works.forget(work)
    const order = this.#arrivalOrder.get(island.number)
    if (order) this.#arrivalOrder.set(island.number, order.filter((evaluation) => evaluation !== ticket.evaluation))
    this.#rows.commit(island, ticket)
    this.#announceTarget(island, ticket)
  }

  #announceTarget(island: Island, ticket: Ticket): void {
    if (island.isControl || !targetReached(this.search.plan, island)) return
    if (ticket.individual !== island.best) return
    const { island: whom, epoch } = this.search.finishEpochAfterTarget(island)
    const sentence = `${nameOf(ticket.individual.id)} reached the target; the search finishes with epoch ${epoch}.`
    const fact: WorldFact = { fact: 'finish', epoch }
    const targets = whom === 0 ? this.search.islands.filter((one) => !one.isControl) : [island]
    for (const one of targets) this.#orderAt(one, 'target-reached', false, sentence, { stage: 'epoch', at: epoch, fact })
  }

  sent(mail: Mail): void {
    this.#rows.mail(mail)
    // Whoever waited for it may go on.
    for (const [number, standing] of this.#standing) if (standing === 'mail') this.#due.add(number)
  }

  // -------------------------------------------------------------------------------- facts of the world

  /** Orders a fact for an island: it enters at the next point that no replay can miss, and is journalled so. */
  order(island: Island, kind: string, sentence: string, fact: WorldFact): void {
    this.#impurities.add(kind)
    const standing = this.#standing.get(island.number)
    const { commits, epochsPassed } = island.counters
    const atEpoch = standing === 'confirmation' || standing === 'mail'
    const data: FactData = atEpoch
      ? { stage: 'sending', at: epochsPassed + 1, fact }
      : { stage: 'waiting', at: commits, fact }
    this.#orderAt(island, kind, true, sentence, data)
  }

  /** Orders a fact for the end of an epoch: the first that no island has passed. */
  orderAtEpoch(kind: string, sentence: string, make: (epoch: number, island: Island) => WorldFact): void {
    this.#impurities.add(kind)
    const shared = this.search.firstOpenEpoch()
    for (const island of this.search.islands) {
      const epoch = island.isControl ? island.counters.epochsPassed + 1 : shared
      const stage = island.ended ? 'waiting' : 'epoch'
      const at = island.ended ? island.counters.commits : epoch
      this.#orderAt(island, kind, true, sentence, { stage, at, fact: make(epoch, island) })
    }
  }

  #orderAt(island: Island, kind: string, changesSearch: boolean, sentence: string, data: FactData): void {
    this.#schedule.add(island.number, data)
    if (data.fact.fact === 'finish' && data.fact.epoch > island.counters.epochsPassed) {
      island.finishAfter(data.fact.epoch)
    }
    const { stage, at } = data
    this.#rows.event(
      eventRow(
        kind,
        island.number,
        stage === 'waiting' ? at : island.counters.commits,
        stage === 'waiting' ? 0 : at,
        changesSearch,
        sentence,
        data,
      ),
    )
    this.#due.add(island.number)
  }

  factWhileWaiting(island: Island): boolean {
    const fact = this.#schedule.next(island.number, 'waiting', island.counters.commits)
    if (fact) apply(this.search, island, fact)
    else if (island.ended) this.#dropWorkOf(island)
    return fact !== undefined
  }
  /** An ended island's unfinished work is of no use any more. */
  #dropWorkOf(island: Island): void {
    for (const work of [...this.#works.all()]) {
      if (work.island === island.number && work.kind === 'first') this.#works.forget(work)
    }
  }
  factsBeforeSending(island: Island, epoch: number): void {
    this.#enter(island, this.#schedule.take(island.number, 'sending', epoch))
  }
  factsAtEpoch(island: Island, epoch: number): void {
    this.#enter(island, this.#schedule.take(island.number, 'epoch', epoch))
    this.#rows.epoch(island)
  }
  #enter(island: Island, facts: readonly WorldFact[]): void {
    for (const fact of facts) apply(this.search, island, fact)
  }

  /** What will be reported is confirmed before the search says that it stands still. */
  #confirmBests(): boolean {
    const bests = this.search.islands.flatMap((island) => island.best ?? [])
    return bests
      .filter((best) => best.failedSimulations === 0)
      .map((best) => this.#isConfirmed(best))
      .every(Boolean)
  }

  // ---------------------------------------------------------------------------------------- for people

  /** 'finished' when all islands have ended, 'rested' when none can go on before more is allowed. */
  status(): 'running' | 'rested' | 'finished' {
    if (!this.#settled) return 'running'
    return this.search.islands.every((island) => island.ended) ? 'finished' : 'rested'
  }

  standing(island: number): Standing | undefined {
    return this.#standing.get(island)
  }

  /** Which facts of the world have changed this search: empty for a pure one. */
  impurities(): readonly string[] {
    return [...this.#impurities].sort()
  }
  addImpurity(kind: string): void {
    this.#impurities.add(kind)
  }

  get inHand(): { readonly waiting: number; readonly submitted: number } {
    return { waiting: this.#works.waiting, submitted: this.#works.submitted }
  }
}

/** Stands in the record where a worker's name would: nobody simulated this, it was given up. */
export const setAsideWorker = 'set-aside'
const shutOutSchema = z.object({ worker: z.string() })

function eventRow(
  kind: string,
  island: number,
  atCommit: number,
  epoch: number,
  changesSearch: boolean,
  sentence: string,
  data: unknown,
): EventRow {
  return { kind, island, atCommit, epoch, changesSearch, sentence, data }
}

function keyOf(island: number, evaluation: number): string {
  return `${island}:${evaluation}`
}

function first(numbers: Set<number>): number | undefined {
  for (const number of numbers) return number
  return undefined
}
