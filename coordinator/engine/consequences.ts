// What follows when simulations of the same differ: a machine is shut out, the search is pinned to one class of
// processors, a committed result is corrected, the problem is refused. Each is an event in the record with what was
// seen, and what was simulated by whoever is not believed any more is looked at again.

import { agree } from '../../shared/exactness.js'
import { islandName, nameOf } from '../../shared/ids.js'
import { refuse } from '../../shared/refusals.js'
import type { Search } from '../evolution/search.js'
import type { Confirmed } from './confirmed.js'
import type { EngineCounts } from './counts.js'
import { differenceInWords, evidenceOf } from './evidence.js'
import type { Orders } from './orders.js'
import { eventRow, type Rows } from './rows.js'
import type { Trust } from './trust.js'
import { answersOf, type Verdict, type Vote } from './votes.js'
import type { Work } from './works.js'

export interface ConsequenceParts {
  readonly search: Search
  readonly rows: Rows
  readonly orders: Orders
  readonly counts: EngineCounts
  readonly trust: Trust
  readonly confirmed: Confirmed
}

type Settled = Extract<Verdict, { kind: 'confirmed' }>
type Dependent = Extract<Verdict, { kind: 'processor-dependent' }>

/** So many processes of one machine, or machines of which they are so large a part, are no accident any more. */
const sharedBlameLeast = 3
const sharedBlamePart = 4

export class Consequences {
  readonly #parts: ConsequenceParts
  /** Processes that other processes of the same machine contradicted. */
  readonly #contradicted = new Map<string, Set<string>>()

  constructor(parts: ConsequenceParts) {
    this.#parts = parts
  }

  /** True when somebody was shut out. Machines by machines, processes by other processes of a lone machine. */
  convict({ executor, ...vote }: Vote, work: Work, { vote: right, agreeing }: Settled): boolean {
    const { trust, search, rows } = this.#parts
    const wrong = { executor, ...vote }
    if (trust.shutOutHosts.has(executor.host) || trust.shutOutWorkers.has(executor.worker)) return false
    const byOthers = agreeing.some((other) => other.executor.host !== executor.host)
    const witnesses = new Set(agreeing.map((other) => other.executor.host))
    const isHost = trust.known && byOthers
    // One machine against one says nothing, unless the one contradicts itself.
    const own = answersOf(
      work.votes.filter((other) => other.executor.host === executor.host),
      { agree: (a, b) => agree(search.plan.problem, a, b) },
    )
    if (isHost && witnesses.size < 2 && own.length < 2) return false
    const evidence = evidenceOf(search.plan, work, right, wrong)
    const where = `evaluation ${work.evaluation} of ${islandName(work.island)}`
    const seen = `two others agree against it${differenceInWords(evidence)}`
    const data = { worker: executor.worker, host: executor.host, evidence }
    if (isHost) {
      trust.shutOutHost(executor.host)
      const sentence = `Machine ${executor.host} gave a wrong result for ${where}: ${seen}. Its results are not used any more; have its memory and processor tested.`
      rows.event(eventRow({ kind: 'host-shut-out', sentence, data }))
    } else {
      trust.shutOutWorker(executor.worker)
      const sentence = `Worker ${executor.worker} on ${executor.host} gave a wrong result for ${where}: ${seen}. Its results are not used any more.`
      rows.event(eventRow({ kind: 'worker-shut-out', sentence, data }))
    }
    this.#refuseSharedBlame(wrong, work, isHost)
    return true
  }

  /** When many are wrong it is not they: the problem does not repeat, and the search says so by its name. */
  #refuseSharedBlame({ executor }: Vote, work: Work, isHost: boolean): void {
    const { trust, search } = this.#parts
    const { name } = search.plan.problem
    const out = trust.shutOutHosts.size
    if (isHost && out >= sharedBlameLeast && out * sharedBlamePart > trust.seen) {
      throw refuse('not-deterministic', {
        detail: `${out} of ${trust.seen} machines gave results for problem ${name} that others contradict, last for ${nameOf(work.individual)}: more than can be faulty at once`,
      })
    }
    if (isHost) return
    const processes = this.#contradicted.get(executor.host) ?? new Set<string>()
    this.#contradicted.set(executor.host, processes.add(executor.worker))
    if (processes.size < sharedBlameLeast) return
    throw refuse('not-deterministic', {
      detail: `${processes.size} processes on ${executor.host} gave results for problem ${name} that other processes there contradict, last for ${nameOf(work.individual)}; either the problem does not repeat or this machine is faulty`,
    })
  }

  /** Answers follow the class of the processor: nobody is wrong, the search goes on with one class. */
  pinAfter(work: Work, { processors }: Dependent): void {
    const { trust, search } = this.#parts
    const [first, second] = processors
    const largest = trust.largestClass()
    const chosen =
      first!.voters > second!.voters
        ? first!
        : (processors.find(({ processor }) => processor === largest) ?? first!)
    const other = chosen === first ? second! : first!
    const evidence = evidenceOf(search.plan, work, chosen.vote, other.vote)
    const sentence = `The problem ${search.plan.problem.name} depends on the processor: class "${chosen.processor}" and class "${other.processor}" differ in evaluation ${work.evaluation} of ${islandName(work.island)}${differenceInWords(evidence)}. No machine is to blame; the search goes on with machines of class "${chosen.processor}" only.`
    this.pin(chosen.processor, sentence, evidence)
  }

  /** The search goes on with one class of processors, from here on. */
  pin(processor: string, sentence: string, evidence: unknown = null): void {
    const { trust, search, rows, orders } = this.#parts
    const changesSearch = search.islands.some(({ counters }) => counters.commits > 0)
    trust.pinTo(processor)
    if (changesSearch) orders.addImpurity('pinned-to-processor')
    rows.event(
      eventRow({ kind: 'pinned-to-processor', changesSearch, sentence, data: { processor, evidence } }),
    )
  }

  /** A committed result was wrong: every island puts it right at a stated point. */
  correct(work: Work, right: Vote): void {
    const { counts, search, orders, confirmed } = this.#parts
    counts.corrections++
    confirmed.noteCorrected(work)
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

  /** @throws always: nobody is blamed for a problem that does not repeat. */
  refuseProblem(work: Work, answers: number): never {
    const last = work.firstReplicate + work.replicates - 1
    throw refuse('not-deterministic', {
      detail: `problem ${this.#parts.search.plan.problem.name}: ${nameOf(work.individual)}, replicates ${work.firstReplicate} to ${last}, gave ${answers} different results in ${work.votes.length} simulations by ${work.votes.map((vote) => vote.executor.worker).join(', ')}`,
    })
  }
}
