// What is known of committed results: which evaluations a second worker confirmed, which blocks were put right, and
// the simulations that are asked for again. Memory keeps a bounded number; the record has them all.

import { check } from '../../shared/check.js'
import { equalBytes } from '../../shared/digests.js'
import { limits } from '../../shared/limits.js'
import type { Executor } from '../../shared/result.js'
import { columnsOf } from '../evolution/estimate.js'
import type { Search } from '../evolution/search.js'
import type { Block, Individual } from '../evolution/types.js'
import type { ArrivalRow, ConfirmationRow, RecordReader } from './ports.js'
import type { Rows } from './rows.js'
import type { Trust } from './trust.js'
import { newWork, type Work, type Works } from './works.js'

/** Stands in the record where a worker's name would: nobody simulated this, it was given up. */
export const setAsideWorker = 'set-aside'

export interface ConfirmedParts {
  readonly search: Search
  readonly reader: RecordReader
  readonly works: Works
  readonly rows: Rows
  readonly trust: Trust
}

/** By whom: another process of the same machine, or another machine. */
export type Level = 'process' | 'host'

/** A block of replicates of an individual. */
export interface BlockKey {
  readonly individual: number
  readonly firstReplicate: number
}

export class Confirmed {
  readonly #parts: ConfirmedParts
  /** Committed evaluations of the living that somebody else confirmed, and who, by island. */
  readonly #evaluations = new Map<number, Map<number, Level>>()
  #count = 0
  /** Blocks that were put right after their commit: two workers agreed on what stands there now. */
  readonly #corrected = new Set<string>()

  constructor(parts: ConfirmedParts) {
    this.#parts = parts
  }

  noteCorrected(block: BlockKey): void {
    this.#corrected.add(keyOf(block))
  }

  isCorrected(block: BlockKey): boolean {
    return this.#corrected.has(keyOf(block))
  }

  remember(island: number, evaluation: number, level: Level): void {
    const known = this.#evaluations.get(island) ?? new Map<number, Level>()
    this.#evaluations.set(island, known)
    if (!known.has(evaluation)) this.#count++
    known.set(evaluation, level)
  }

  /** Confirmations of the dead are in the record; memory keeps a bounded number. */
  prune(): void {
    if (this.#count < limits.confirmedInMemory) return
    this.#evaluations.clear()
    this.#count = 0
  }

  /**
   * True when every result of the individual was confirmed, by another machine where there is one; asks for what is
   * missing.
   */
  isConfirmed(individual: Individual): boolean {
    let all = true
    let offset = 0
    for (const block of individual.blocks) {
      const length = (individual.values.length / individual.replicates) * block.replicates
      if (!this.#blockConfirmed(individual.id, block) && this.#simulateAgain(individual, block, length)) {
        all = false
      }
      offset += length
    }
    check(offset === individual.values.length, 'blocks cover the values of an individual')
    return all
  }

  #blockConfirmed(individual: number, { island, evaluation, firstReplicate }: Block): boolean {
    if (this.isCorrected({ individual, firstReplicate })) return true
    const level = this.#levelOf(island, evaluation)
    if (level === undefined || level === 'host') return level !== undefined
    const { reader, rows, trust } = this.#parts
    const host = (rows.findArrival(island, evaluation) ?? reader.arrival(island, evaluation))?.host
    return host === undefined || !trust.elsewhere(new Set([host]))
  }

  #levelOf(island: number, evaluation: number): Level | undefined {
    const known = this.#evaluations.get(island)?.get(evaluation)
    if (known) return known
    const level = levelOfRows(this.#parts.reader.confirmations(island, evaluation))
    if (level !== undefined) this.remember(island, evaluation, level)
    return level
  }

  /** True when somebody whose results are used has given what the record has of this evaluation. */
  isVouched(island: number, evaluation: number): boolean {
    const { reader, trust } = this.#parts
    const arrival = reader.arrival(island, evaluation)
    if (!arrival || trust.accepts(arrival)) return arrival !== undefined
    return reader.confirmations(island, evaluation).some((row) => row.agrees && trust.accepts(row))
  }

  /** Asks again for every result of the individual that nobody vouches for any more. */
  lookAgain(individual: Individual): void {
    let offset = 0
    for (const block of individual.blocks) {
      const length = (individual.values.length / individual.replicates) * block.replicates
      const key = { individual: individual.id, firstReplicate: block.firstReplicate }
      if (!this.isCorrected(key) && !this.isVouched(block.island, block.evaluation)) {
        const work = this.#simulateAgain(individual, block, length)
        if (work) work.suspect = true
      }
      offset += length
    }
    check(offset === individual.values.length, 'blocks cover the values of an individual')
  }

  /** The work of simulating a committed evaluation of somebody living again, or undefined when nobody living has it. */
  workAgain(island: number, evaluation: number): Work | undefined {
    for (const individual of this.#parts.search.island(island).living()) {
      const block = individual.blocks.find((one) => one.island === island && one.evaluation === evaluation)
      if (!block || this.isCorrected({ individual: individual.id, firstReplicate: block.firstReplicate }))
        continue
      const length = (individual.values.length / individual.replicates) * block.replicates
      return this.#simulateAgain(individual, block, length)
    }
    return undefined
  }

  /** Undefined for what was set aside: nobody simulated that, and nobody is asked to. */
  #simulateAgain(individual: Individual, block: Block, values: number): Work | undefined {
    const { works, search, rows, reader } = this.#parts
    const inHand = works.find(block.island, block.evaluation)
    if (inHand) return inHand
    const recorded =
      rows.findArrival(block.island, block.evaluation) ?? reader.arrival(block.island, block.evaluation)
    check(recorded !== undefined, 'a committed result is in the record')
    if (recorded.worker === setAsideWorker) return undefined
    const work = newWork({
      island: block.island,
      evaluation: block.evaluation,
      individual: individual.id,
      firstReplicate: block.firstReplicate,
      replicates: block.replicates,
      simulations: values / columnsOf(search.plan.problem),
      expectedCost: 1,
      genome: search.island(block.island).bytesOf(individual.genome),
      kind: 'again',
    })
    work.votes.push({ result: recorded.result, digest: recorded.digest, executor: executorOf(recorded) })
    works.add(work)
    works.want(work, 'confirm')
    return work
  }
}

function levelOfRows(rows: readonly ConfirmationRow[]): Level | undefined {
  const agreeing = rows.filter(({ agrees }) => agrees)
  if (agreeing.length === 0) return undefined
  return agreeing.some(({ by }) => by === 'host') ? 'host' : 'process'
}

/**
 * By whom all results of an individual were confirmed, as the record has it: by other machines, or only by other
 * processes of the same; undefined when something is not confirmed. What was corrected was confirmed by the two that
 * agreed against it.
 */
export function confirmedBy(
  reader: Pick<RecordReader, 'confirmations'>,
  { blocks }: Pick<Individual, 'blocks'>,
): Level | undefined {
  const levels = blocks.map(({ island, evaluation }) => {
    const rows = reader.confirmations(island, evaluation)
    return levelOfRows(rows) ?? levelOfPairs(rows)
  })
  if (levels.includes(undefined)) return undefined
  return levels.includes('process') ? 'process' : 'host'
}

function levelOfPairs(rows: readonly ConfirmationRow[]): Level | undefined {
  for (const row of rows) {
    const same = rows.filter((other) => other !== row && equalBytes(other.digest, row.digest))
    if (same.length > 0) return same.some(({ host }) => host !== row.host) ? 'host' : 'process'
  }
  return undefined
}

/** Who simulated, as the record has it. */
export function executorOf({
  worker,
  host,
  processor,
}: Pick<ArrivalRow, 'worker' | 'host' | 'processor'>): Executor {
  return { kind: 'thread', worker, host, ...(processor === undefined ? {} : { processor }) }
}

function keyOf({ individual, firstReplicate }: BlockKey): string {
  return `${individual} ${firstReplicate}`
}
