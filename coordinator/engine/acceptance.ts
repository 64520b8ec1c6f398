// What is believed. A result is accepted at once, or after somebody else has confirmed it: a fraction chosen by
// hash, whatever would become the best so far of an objective on its island, whoever is about to leave an island,
// and what is reported. Somebody else is another machine; where there is none it is a fresh process, and what is best
// or reported is confirmed once more when there is one. How votes are read is votes.ts, whose are used trust.ts, what
// follows from a difference consequences.ts.
//
// Nothing waits for ever: whom to ask is decided anew whenever work is handed out, and a difference that nobody left
// can settle ends after a while: what was not committed yet is set aside.

import { z } from 'zod'
import { check } from '../../shared/check.js'
import { resultDigest } from '../../shared/digests.js'
import { agree, ruleOf } from '../../shared/exactness.js'
import { islandName, nameOf } from '../../shared/ids.js'
import { limits } from '../../shared/limits.js'
import type { DispatchFact, EvaluationResult } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { columnsOf } from '../evolution/estimate.js'
import type { Island } from '../evolution/island.js'
import type { Outcome, Search } from '../evolution/search.js'
import type { Ticket } from '../evolution/tickets.js'
import { ArrivalOrder } from './arrival-order.js'
import { Confirmed, executorOf, setAsideWorker } from './confirmed.js'
import { Consequences } from './consequences.js'
import type { EngineCounts } from './counts.js'
import type { Orders } from './orders.js'
import type { RecordReader } from './ports.js'
import { eventRow, type Rows } from './rows.js'
import { processOf, type Trust, type Where } from './trust.js'
import { answersOf, type Verdict, type Vote, verdictOf } from './votes.js'
import { readingOf, whereNext } from './witnesses.js'
import { isNeeded, type Purpose, type Work, type Works } from './works.js'

type ResultFact = Extract<DispatchFact, { kind: 'result' }>
type LossFact = Extract<DispatchFact, { kind: 'lost' }>

const correctionSchema = z.object({ fact: z.object({ individual: z.number(), firstReplicate: z.number() }) })

export interface AcceptanceParts {
  readonly search: Search
  readonly reader: RecordReader
  readonly works: Works
  readonly rows: Rows
  readonly orders: Orders
  readonly counts: EngineCounts
  readonly trust: Trust
  /** How long a difference that nobody left can settle, or a class without machines, is waited for. */
  readonly patienceMs: number
  /** Something may let this island go on; 0: any that waits for confirmations. */
  readonly wake: (island: number) => void
}

export class Acceptance {
  readonly #parts: AcceptanceParts
  readonly #consequences: Consequences
  /** What is known of committed results. */
  readonly confirmed: Confirmed
  /** Somebody is not believed any more: earlier results are to be looked at again once the record has them all. */
  #suspectsDue = false
  /** Version of the trust at which everything was judged last. */
  #judgedVersion = 0
  /** Differences that nobody left can settle, and since when. */
  readonly #stuck = new Map<Work, number>()
  #withoutClassSinceMs: number | undefined
  #nowMs = 0
  readonly #arrivalOrder = new ArrivalOrder()

  constructor(parts: AcceptanceParts) {
    this.#parts = parts
    this.confirmed = new Confirmed(parts)
    this.#consequences = new Consequences({ ...parts, confirmed: this.confirmed })
    // What an earlier life has decided.
    for (const event of parts.reader.events()) {
      parts.trust.recall(event)
      if (event.kind === 'correction') this.confirmed.noteCorrected(correctionSchema.parse(event.data).fact)
    }
    this.#suspectsDue = parts.trust.version > 0
  }

  /** Takes up what the record has of a ticket. False when it must be simulated. */
  resume(work: Work): boolean {
    const { reader } = this.#parts
    const arrival = reader.arrival(work.island, work.evaluation)
    if (!arrival || !this.confirmed.isVouched(work.island, work.evaluation)) return false
    work.recorded = { result: arrival.result, digest: arrival.digest, executor: executorOf(arrival) }
    const seconds = reader.confirmations(work.island, work.evaluation)
    work.confirmed = seconds.some(({ agrees }) => agrees) || arrival.worker === setAsideWorker
    work.confirmedBy = seconds.some(({ agrees, by }) => agrees && by === 'host') ? 'host' : 'process'
    // Somebody contradicted it, and who was right is not known yet.
    if (seconds.some(({ agrees }) => !agrees)) work.spotCheck = true
    this.#vote(work, work.recorded, 'evaluate')
    return true
  }

  /** The machines changed, or time passed: what was judged by the former is judged again. */
  look(nowMs: number): void {
    this.#nowMs = nowMs
    const { trust } = this.#parts
    if (trust.known) this.#choosePin(nowMs)
    if (trust.version !== this.#judgedVersion) this.#judgeAgain()
    for (const [work, sinceMs] of this.#stuck)
      if (nowMs - sinceMs >= this.#parts.patienceMs) this.#giveUp(work)
  }

  /** With problems that are exact on one class only, one is chosen; when its machines stay away, another. */
  #choosePin(nowMs: number): void {
    const { trust, search, patienceMs } = this.#parts
    const largest = trust.largestClass()
    if (largest === undefined) return
    if (trust.pinned === undefined) {
      if (!ruleOf(search.plan.problem).oneProcessorClass) return
      const sentence = `The problem promises equal bits on one class of processors: the search uses machines of class "${largest}".`
      this.#consequences.pin(largest, sentence)
      return
    }
    this.#withoutClassSinceMs = trust.usable.length > 0 ? undefined : (this.#withoutClassSinceMs ?? nowMs)
    if (this.#withoutClassSinceMs === undefined || nowMs - this.#withoutClassSinceMs < patienceMs) return
    this.#withoutClassSinceMs = undefined
    if (largest === trust.pinned) return
    const sentence = `No machine of processor class "${trust.pinned}" is there any more: the search goes on with class "${largest}".`
    this.#consequences.pin(largest, sentence)
  }

  #judgeAgain(): void {
    const { trust, works, search } = this.#parts
    do {
      this.#judgedVersion = trust.version
      this.#stuck.clear()
      for (const work of works.all()) this.#dropUnbelieved(work)
      for (const work of works.all()) if (work.votes.length > 1 && !work.confirmed) this.#judge(work)
    } while (trust.version !== this.#judgedVersion)
    for (const island of search.islands) this.#parts.wake(island.number)
    if (!trust.byHost) return
    // Confirmed by a process while there was one machine: another can say it now.
    for (const { best } of search.islands)
      if (best && best.failedSimulations === 0) this.confirmed.isConfirmed(best)
  }

  // ----------------------------------------------------------------------------------------- results

  take(work: Work, fact: ResultFact): void {
    const { works, counts, search } = this.#parts
    const lane = work[fact.item.purpose]
    const { attempt } = fact.item
    if (lane.attempt === attempt || (lane.earlier > 0 && lane.earlier === attempt)) {
      if (lane.earlier > 0 && lane.attempt === attempt) counts.hedgesFirst++
      works.settle(work, fact.item.purpose)
    }
    if (!this.#parts.trust.accepts(fact.executor)) {
      counts.late++
      if (isNeeded(work, fact.item.purpose)) works.want(work, fact.item.purpose)
      return
    }
    if (isSetAside(work)) {
      // Given up is given up: the record may say so already.
      counts.late++
      return
    }
    check(
      fact.result.values.length === work.simulations * columnsOf(search.plan.problem),
      'a dispatcher hands over whole results',
    )
    counts.results++
    const vote = { result: fact.result, digest: fact.digest, executor: fact.executor }
    if (!this.#vote(work, vote, fact.item.purpose)) {
      counts.duplicates++
      return
    }
    if (work.votes.length === 1) this.#keep(work, fact.cpuSeconds)
    else this.#keepConfirmation(work, vote)
    this.#judge(work)
  }

  /** Committed already, or of another search: nothing changes, but a difference is said. */
  takeLate(fact: ResultFact): void {
    const { counts, reader, rows } = this.#parts
    counts.late++
    const { island, evaluation } = fact.item
    const known = reader.arrival(island, evaluation) ?? rows.findArrival(island, evaluation)
    if (!known || known.worker === setAsideWorker || !this.#parts.trust.accepts(fact.executor)) return
    if (agree(this.#parts.search.plan.problem, known, fact)) return
    counts.disagreements++
    const sentence = `A late result of evaluation ${evaluation} of ${islandName(island)} by ${fact.executor.worker} differs from the one that was used, by ${known.worker}.`
    rows.event(eventRow({ kind: 'late-result-differs', sentence }))
    // Who is right is found out where it still matters.
    const work = this.confirmed.workAgain(island, evaluation)
    if (!work) return
    work.suspect = true
    const { result, digest, executor } = fact
    if (this.#vote(work, { result, digest, executor }, 'confirm')) this.#judge(work)
  }

  /** Counts a vote; false when this process has said the same before. */
  #vote(work: Work, vote: Vote, purpose: Purpose): boolean {
    const { works, counts, wake } = this.#parts
    if (work.votes.length > 0) {
      const own = processOf(vote.executor.worker)
      const earlier = work.votes.filter((other) => processOf(other.executor.worker) === own)
      if (earlier.some((other) => this.#agree(other, vote))) {
        if (purpose === 'confirm' && !work.confirmed) works.want(work, 'confirm')
        return false
      }
      // Whoever contradicts himself is no witness: others must say it.
      if (earlier.length > 0) {
        counts.disagreements++
        work.spotCheck = true
      }
    }
    work.votes.push(vote)
    work.clearedAt = -1
    if (work.votes.length === 1 && work.kind === 'first') this.#noteArrival(work)
    wake(work.island)
    return true
  }

  readonly #agree = (a: Vote, b: Vote): boolean => agree(this.#parts.search.plan.problem, a, b)

  #noteArrival({ island, evaluation }: Work): void {
    if (this.#parts.search.island(island).tools.island.order !== 'arrival') return
    this.#arrivalOrder.note(island, evaluation)
  }

  /** Writes the first vote down where the record does not have it yet. */
  #keep(work: Work, cpuSeconds = 0): void {
    const vote = work.votes[0]
    if (!vote || vote === work.recorded) return
    work.recorded = vote
    this.#parts.rows.arrival({
      island: work.island,
      evaluation: work.evaluation,
      worker: vote.executor.worker,
      host: vote.executor.host,
      ...processorOf(vote),
      attempt: Math.max(1, work.evaluate.attempt),
      cpuSeconds,
      result: vote.result,
      digest: vote.digest,
    })
  }

  #keepConfirmation(work: Work, vote: Vote): void {
    const first = work.votes[0]!
    this.#parts.counts.confirmations++
    this.#parts.rows.confirmation({
      island: work.island,
      evaluation: work.evaluation,
      worker: vote.executor.worker,
      host: vote.executor.host,
      ...processorOf(vote),
      by: vote.executor.host === first.executor.host ? 'process' : 'host',
      digest: vote.digest,
      agrees: this.#agree(vote, first),
    })
  }

  /** After a vote: is it settled, does it need another, is somebody wrong? */
  #judge(work: Work): void {
    const { works, search, trust } = this.#parts
    const reading = readingOf(work, trust, search.plan.problem)
    const verdict = verdictOf(work.votes, reading)
    work.disputed = false
    if (verdict.kind === 'confirmed') this.#settle(work, verdict)
    else if (verdict.kind === 'unconfirmed') {
      const must = work.kind === 'again' || this.#mustConfirm(search.island(work.island), work)
      if (must) works.want(work, 'confirm')
    } else if (verdict.kind === 'not-deterministic') {
      this.#consequences.refuseProblem(work, answersOf(work.votes, reading).length)
    } else this.#dispute(work, verdict)
  }

  #dispute(
    work: Work,
    verdict: Exclude<Verdict, { kind: 'confirmed' | 'unconfirmed' | 'not-deterministic' }>,
  ): void {
    const { works, counts } = this.#parts
    counts.disagreements++
    work.disputed = true
    work.onProcessors = verdict.kind === 'disputed' ? verdict.onProcessors : []
    // Two votes of a class that is used no more, or one of the class and the other not: it is asked there again.
    works.want(work, 'confirm')
    if (verdict.kind !== 'processor-dependent') return
    this.#consequences.pinAfter(work, verdict)
    this.#suspectsDue = true
  }

  #settle(work: Work, verdict: Extract<Verdict, { kind: 'confirmed' }>): void {
    const { works, wake, search } = this.#parts
    const { vote: right, agreeing, wrong } = verdict
    work.confirmed = true
    work.confirmedBy = verdict.by
    this.#stuck.delete(work)
    const overruled = !this.#agree(work.votes[0]!, right)
    if (work.kind === 'first' && overruled) {
      // Nothing was committed with the wrong one: the right one takes its place, and keeps its witnesses.
      work.votes = [right, ...work.votes.filter((vote) => vote !== right)]
      work.clearedAt = -1
      this.#keep(work)
      for (const other of agreeing) if (other !== right) this.#keepConfirmation(work, other)
    }
    if (work.kind === 'again') {
      this.confirmed.remember(work.island, work.evaluation, verdict.by)
      if (overruled) this.#consequences.correct(work, right)
      works.forget(work)
      wake(0)
    }
    if (!ruleOf(search.plan.problem).convicts) return
    // Not filter(): everybody who was wrong is told.
    for (const vote of wrong) if (this.#consequences.convict(vote, work, verdict)) this.#suspectsDue = true
  }

  /** What nobody vouches for any more is simulated again, unless it is committed. */
  #dropUnbelieved(work: Work): void {
    const { works, trust } = this.#parts
    if (work.kind !== 'first' || work.votes.length === 0) return
    const first = work.votes[0]!
    const left = work.votes.filter(({ executor }) => trust.accepts(executor))
    if (left.length === work.votes.length) return
    if (work.confirmed && left.some((vote) => this.#agree(vote, first))) return
    work.votes = left
    work.confirmed = false
    work.disputed = false
    work.clearedAt = -1
    this.#keep(work)
    if (left.length === 0) works.want(work, 'evaluate')
    else if (left.length === 1) this.#judge(work)
  }

  /** Where this work is simulated next; undefined when nobody left can tell anything. */
  whereFor(work: Work, purpose: Purpose): Where | undefined {
    if (purpose === 'evaluate' && work.votes.length === 0) return this.#parts.trust.anywhere()
    const where = whereNext(work, this.#parts.trust)
    if (!where && !this.#stuck.has(work)) this.#stuck.set(work, this.#nowMs)
    return where
  }

  /** Counts why a second simulation was asked for. */
  noteSecond(work: Work): void {
    const { counts } = this.#parts
    if (work.suspect || work.votes.length > 1) counts.rechecks++
    else if (work.kind === 'first' && work.spotCheck === true) counts.spotChecks++
    else counts.bestChecks++
  }

  /** Nobody left can say who is right: what is not committed is given up, what is committed stands as it is. */
  #giveUp(work: Work): void {
    const { works, rows, orders, search, wake } = this.#parts
    this.#stuck.delete(work)
    const who = [...new Set(work.votes.map(({ executor }) => executor.host))].join(' and ')
    const sentence = `${nameOf(work.individual)} gave different results on ${who}, and there is no other machine to settle it: ${
      work.kind === 'first' ? 'it is set aside' : 'its result stands unconfirmed'
    }. Start a worker on one more machine.`
    const isFirst = work.kind === 'first'
    const atCommit = search.island(work.island).counters.commits
    const { island, evaluation, individual } = work
    const data = { evaluation, individual }
    if (isFirst) orders.addImpurity('dispute-unsettled')
    rows.event(
      eventRow({ kind: 'dispute-unsettled', island, atCommit, changesSearch: isFirst, sentence, data }),
    )
    if (isFirst) this.#failInstead(work, 'machines disagreed about it and nobody could settle it', who)
    else {
      this.confirmed.remember(island, evaluation, 'host')
      works.forget(work)
    }
    wake(island)
    wake(0)
  }

  /** A failed result, always the same, in place of what was simulated. */
  #failInstead(work: Work, reason: string, host: string): void {
    const { search, works } = this.#parts
    const result: EvaluationResult = {
      values: new Float64Array(work.simulations * columnsOf(search.plan.problem)),
      failures: Array.from({ length: work.simulations }, (_, simulation) => ({ simulation, reason })),
    }
    const executor = { kind: 'process', worker: setAsideWorker, host } as const
    works.settle(work, 'confirm')
    work.votes = []
    work.disputed = false
    this.#vote(work, { result, digest: resultDigest(result), executor }, 'evaluate')
    work.confirmed = true
    this.#keep(work)
  }

  // ------------------------------------------------------------------------------------------ losses

  /** The last try died as well: a failed result, always the same, and the story as an event. */
  setAside(work: Work, fact: LossFact): void {
    const { counts, search, rows, orders, works, wake } = this.#parts
    if (work.disputed) {
      this.#giveUp(work)
      return
    }
    if (work.votes.length > 0) {
      // It was simulated once and only its confirmation dies: the result stands, unconfirmed, and that is said.
      work.confirmed = true
      if (work.kind === 'again') {
        this.confirmed.remember(work.island, work.evaluation, 'host')
        works.forget(work)
      }
      const sentence = `The confirmation of ${nameOf(work.individual)} died ${limits.attemptsAlone} times (${fact.cause}); its first result stands unconfirmed.`
      rows.event(eventRow({ kind: 'confirmation-given-up', sentence, island: work.island }))
      wake(work.island)
      wake(0)
      return
    }
    counts.setAside++
    // The same words whatever the deaths were like: the result enters the digest, the event tells the rest.
    this.#failInstead(work, 'set aside after its last try', fact.executor.host)
    orders.addImpurity('set-aside')
    rows.event(
      eventRow({
        kind: 'set-aside',
        island: work.island,
        atCommit: search.island(work.island).counters.commits,
        changesSearch: true,
        sentence: `${nameOf(work.individual)} was given up after its last try (${fact.cause}). Last words: ${fact.detail.slice(0, limits.lossDetailLength)}`,
        data: { evaluation: work.evaluation, individual: work.individual, cause: fact.cause },
      }),
    )
  }

  // ------------------------------------------------------------------------------- at the commit gate

  /** The accepted outcome, judged against committed state; asks for a confirmation where one is missing. */
  outcome(island: Island, ticket: Ticket): Outcome | undefined {
    const { works } = this.#parts
    const work = works.find(island.number, ticket.evaluation)
    const vote = work?.votes[0]
    if (!work || !vote || (work.disputed && !work.confirmed)) return undefined
    if (this.#mustConfirm(island, work)) {
      works.want(work, 'confirm')
      return undefined
    }
    return vote
  }

  nextArrival(island: Island): number | undefined {
    return this.#arrivalOrder.of(island.number).find((evaluation) => {
      const ticket = island.ticket(evaluation)
      return ticket !== undefined && this.outcome(island, ticket) !== undefined
    })
  }

  committed(work: Work): void {
    check(work.recorded === work.votes[0], 'what is committed is what the record holds')
    if (work.confirmed) this.confirmed.remember(work.island, work.evaluation, work.confirmedBy)
    this.#parts.works.forget(work)
    this.#arrivalOrder.forget(work.island, work.evaluation)
  }

  /** Spot checks chosen by hash, and results that would become the best so far on any objective. */
  #mustConfirm(island: Island, work: Work): boolean {
    if (work.confirmed || work.kind !== 'first') return false
    const { seed, confirm } = this.#parts.search.plan
    work.spotCheck ??=
      confirm.fraction > 0 &&
      stream(seed, 'confirm', work.island, work.evaluation).uniform() < confirm.fraction
    if (work.spotCheck) return true
    // Best scores only fall, so who was no would-be best stays none.
    if (work.clearedAt === island.bestScoresVersion) return false
    const ticket = island.ticket(work.evaluation)
    const vote = work.votes[0]
    if (ticket && vote && island.wouldBeBest(ticket, vote.result)) return true
    work.clearedAt = island.bestScoresVersion
    return false
  }

  // --------------------------------------------------------------------- confirming what is committed

  /** Looks again at everything alive that was simulated by whoever is not believed any more. */
  lookAtSuspects(): void {
    if (!this.#suspectsDue) return
    this.#suspectsDue = false
    for (const island of this.#parts.search.islands) {
      for (const individual of island.living()) this.confirmed.lookAgain(individual)
    }
  }
}

function isSetAside(work: Work): boolean {
  return work.votes[0]?.executor.worker === setAsideWorker
}

const processorOf = ({ executor }: Vote) =>
  executor.processor === undefined ? {} : { processor: executor.processor }
