// What is believed. A result is accepted at once, or after a second worker has confirmed it: a fraction chosen by
// hash, whatever would become the best so far of an objective on its island, whoever is about to leave an island,
// and what is reported. A worker that stands alone against two is shut out, and what else it simulated of the
// living is looked at again; a committed result that turns out wrong is corrected at a stated point.

import { z } from 'zod'
import { check } from '../../shared/check.js'
import { equalBytes, resultDigest } from '../../shared/digests.js'
import { islandName, nameOf } from '../../shared/ids.js'
import { limits } from '../../shared/limits.js'
import { refuse } from '../../shared/refusals.js'
import type { DispatchFact, EvaluationResult } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { columnsOf } from '../evolution/estimate.js'
import type { Island } from '../evolution/island.js'
import type { Outcome, Search } from '../evolution/search.js'
import type { Ticket } from '../evolution/tickets.js'
import { Confirmed, setAsideWorker } from './confirmed.js'
import type { EngineCounts } from './counts.js'
import type { Orders } from './orders.js'
import type { RecordReader } from './ports.js'
import { eventRow, type Rows } from './rows.js'
import { answersOf, answersTolerated, type Vote, verdictOf } from './votes.js'
import { isNeeded, type Purpose, type Work, type Works } from './works.js'

type ResultFact = Extract<DispatchFact, { kind: 'result' }>
type LossFact = Extract<DispatchFact, { kind: 'lost' }>

const shutOutSchema = z.object({ worker: z.string() })
const correctionSchema = z.object({ fact: z.object({ individual: z.number(), firstReplicate: z.number() }) })

export interface AcceptanceParts {
  readonly search: Search
  readonly reader: RecordReader
  readonly works: Works
  readonly rows: Rows
  readonly orders: Orders
  readonly counts: EngineCounts
  /** Something may let this island go on; 0: any that waits for confirmations. */
  readonly wake: (island: number) => void
}

export class Acceptance {
  readonly shutOut = new Set<string>()
  readonly #parts: AcceptanceParts
  /** What is known of committed results. */
  readonly confirmed: Confirmed
  /** Workers whose earlier results are to be looked at again once the record has them all. */
  readonly #suspects: string[] = []
  /** Islands of order 'arrival': evaluations whose first result is in, in order. */
  readonly #arrivalOrder = new Map<number, number[]>()

  constructor(parts: AcceptanceParts) {
    this.#parts = parts
    this.confirmed = new Confirmed(parts)
    for (const event of parts.reader.events()) {
      if (event.kind === 'worker-shut-out') this.shutOut.add(shutOutSchema.parse(event.data).worker)
      if (event.kind === 'correction') this.confirmed.noteCorrected(correctionSchema.parse(event.data).fact)
    }
    this.#suspects.push(...this.shutOut)
  }

  /** Takes up what the record has of a ticket. False when it must be simulated. */
  resume(work: Work): boolean {
    const { reader } = this.#parts
    const arrival = reader.arrival(work.island, work.evaluation)
    const confirmed = reader.isConfirmed(work.island, work.evaluation)
    if (!arrival || (!confirmed && this.shutOut.has(arrival.worker))) return false
    const executor = { kind: 'thread', worker: arrival.worker, host: arrival.host } as const
    work.recorded = { result: arrival.result, digest: arrival.digest, executor }
    work.confirmed = confirmed || arrival.worker === setAsideWorker
    // Somebody contradicted it, and who was right is not known yet.
    const disputed = reader.confirmations(work.island, work.evaluation).some(({ agrees }) => !agrees)
    if (disputed) work.spotCheck = true
    this.#vote(work, work.recorded, 'evaluate')
    return true
  }

  // ----------------------------------------------------------------------------------------- results

  take(work: Work, fact: ResultFact): void {
    const { works, counts, search } = this.#parts
    if (work[fact.item.purpose].attempt === fact.item.attempt) works.settle(work, fact.item.purpose)
    if (this.shutOut.has(fact.executor.worker)) {
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
    const known = reader.arrival(fact.item.island, fact.item.evaluation)
    if (!known || equalBytes(known.digest, fact.digest)) return
    counts.disagreements++
    const sentence = `A late result of evaluation ${fact.item.evaluation} of ${islandName(fact.item.island)} by ${fact.executor.worker} differs from the one that was used, by ${known.worker}.`
    rows.event(eventRow({ kind: 'late-result-differs', sentence }))
  }

  /** Counts a vote; false when this worker has voted before. */
  #vote(work: Work, vote: Vote, purpose: Purpose): boolean {
    const { works, counts, wake } = this.#parts
    const { worker } = vote.executor
    const earlier =
      work.votes.length > 0 ? work.votes.find((other) => other.executor.worker === worker) : undefined
    if (earlier) {
      // Whoever contradicts himself is no witness: others must say it.
      const contradicts = !equalBytes(earlier.digest, vote.digest)
      if (contradicts) {
        counts.disagreements++
        work.spotCheck = true
      }
      if (purpose === 'confirm' || contradicts) works.want(work, 'confirm')
      return false
    }
    work.votes.push(vote)
    work.clearedAt = -1
    if (work.votes.length === 1 && work.kind === 'first') this.#noteArrival(work)
    wake(work.island)
    return true
  }

  #noteArrival({ island, evaluation }: Work): void {
    if (this.#parts.search.island(island).tools.island.order !== 'arrival') return
    this.#arrivalOrder.set(island, [...(this.#arrivalOrder.get(island) ?? []), evaluation])
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
      attempt: work.evaluate.attempt,
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
      by: vote.executor.host === first.executor.host ? 'process' : 'host',
      digest: vote.digest,
      agrees: equalBytes(vote.digest, first.digest),
    })
  }

  /** After a vote: is it settled, does it need another, is somebody wrong? */
  #judge(work: Work): void {
    const { works, counts, search } = this.#parts
    if (work.votes.length === 1) {
      if (this.#mustConfirm(search.island(work.island), work)) works.want(work, 'confirm')
      return
    }
    const verdict = verdictOf(work.votes)
    if (verdict.kind === 'confirmed') this.#settle(work, verdict.vote, verdict.wrong)
    else {
      counts.disagreements++
      if (answersOf(work.votes) > answersTolerated) throw notRepeatable(work)
      works.want(work, 'confirm')
    }
  }

  #settle(work: Work, right: Vote, wrong: readonly Vote[]): void {
    const { works, wake } = this.#parts
    work.confirmed = true
    const overruled = !equalBytes(work.votes[0]!.digest, right.digest)
    if (work.kind === 'first' && overruled) {
      // Nothing was committed with the wrong one: the right one takes its place.
      work.votes = [right, ...work.votes.filter((vote) => vote !== right)]
      work.clearedAt = -1
      this.#keep(work)
    }
    if (work.kind === 'again') {
      this.confirmed.remember(work.island, work.evaluation)
      if (overruled) this.#correct(work, right)
      works.forget(work)
      wake(0)
    }
    for (const vote of wrong) this.#convict(vote, work)
  }

  /** A committed result was wrong: every island puts it right at a stated point. */
  #correct(work: Work, right: Vote): void {
    const { counts, search, orders } = this.#parts
    counts.corrections++
    this.confirmed.noteCorrected(work)
    const sentence = `The result of ${nameOf(work.individual)} (evaluation ${work.evaluation} of ${islandName(work.island)}) was wrong and was corrected.`
    for (const island of search.islands) {
      orders.now(island, 'correction', sentence, {
        fact: 'amend',
        individual: work.individual,
        firstReplicate: work.firstReplicate,
        result: { values: [...right.result.values], failures: [...right.result.failures] },
      })
    }
  }

  #convict({ executor }: Vote, work: Work): void {
    const { works, rows } = this.#parts
    if (this.shutOut.has(executor.worker)) return
    this.shutOut.add(executor.worker)
    this.#suspects.push(executor.worker)
    const sentence = `Worker ${executor.worker} on ${executor.host} gave a wrong result for evaluation ${work.evaluation} of ${islandName(work.island)}: two others agree against it. Its results are not used any more.`
    rows.event(eventRow({ kind: 'worker-shut-out', sentence, data: { worker: executor.worker } }))
    for (const other of works.all()) {
      if (other.kind !== 'first' || other.confirmed) continue
      const left = other.votes.filter((vote) => vote.executor.worker !== executor.worker)
      if (left.length === other.votes.length) continue
      other.votes = left
      other.clearedAt = -1
      this.#keep(other)
      if (left.length === 0) works.want(other, 'evaluate')
      else if (verdictOf(left).kind === 'disputed') works.want(other, 'confirm')
    }
  }

  // ------------------------------------------------------------------------------------------ losses

  /** The last try died as well: a failed result, always the same, and the story as an event. */
  setAside(work: Work, fact: LossFact): void {
    const { counts, search, rows, orders, works, wake } = this.#parts
    if (work.votes.length > 0) {
      // It was simulated once and only its confirmation dies: the result stands, unconfirmed, and that is said.
      work.confirmed = true
      if (work.kind === 'again') {
        this.confirmed.remember(work.island, work.evaluation)
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
    const reason = 'set aside after its last try'
    const result: EvaluationResult = {
      values: new Float64Array(work.simulations * columnsOf(search.plan.problem)),
      failures: Array.from({ length: work.simulations }, (_, simulation) => ({ simulation, reason })),
    }
    const executor = { kind: 'process', worker: setAsideWorker, host: fact.executor.host } as const
    this.#vote(work, { result, digest: resultDigest(result), executor }, 'evaluate')
    work.confirmed = true
    this.#keep(work)
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
    if (!work || !vote || (work.votes.length > 1 && !work.confirmed)) return undefined
    if (this.#mustConfirm(island, work)) {
      works.want(work, 'confirm')
      return undefined
    }
    return vote
  }

  nextArrival(island: Island): number | undefined {
    return this.#arrivalOrder.get(island.number)?.find((evaluation) => {
      const ticket = island.ticket(evaluation)
      return ticket !== undefined && this.outcome(island, ticket) !== undefined
    })
  }

  committed(work: Work): void {
    check(work.recorded === work.votes[0], 'what is committed is what the record holds')
    if (work.confirmed) this.confirmed.remember(work.island, work.evaluation)
    this.#parts.works.forget(work)
    const order = this.#arrivalOrder.get(work.island)
    if (order) {
      this.#arrivalOrder.set(
        work.island,
        order.filter((evaluation) => evaluation !== work.evaluation),
      )
    }
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

  /** Looks again at everything alive that a convicted worker has simulated and nobody confirmed. */
  lookAtSuspects(): void {
    if (this.#suspects.length === 0) return
    const { search, reader } = this.#parts
    const suspects = new Set(this.#suspects.splice(0))
    for (const island of search.islands) {
      for (const individual of island.living()) {
        const suspected = individual.blocks.some((block) => {
          const arrival = reader.arrival(block.island, block.evaluation)
          return arrival !== undefined && suspects.has(arrival.worker)
        })
        if (suspected) this.confirmed.isConfirmed(individual)
      }
    }
  }
}

function isSetAside(work: Work): boolean {
  return work.votes[0]?.executor.worker === setAsideWorker
}

function notRepeatable(work: Work): Error {
  const last = work.firstReplicate + work.replicates - 1
  return refuse('not-deterministic', {
    detail: `${nameOf(work.individual)}, replicates ${work.firstReplicate} to ${last}, gave ${answersOf(work.votes)} different results in ${work.votes.length} simulations by ${work.votes.map((vote) => vote.executor.worker).join(', ')}`,
  })
}
