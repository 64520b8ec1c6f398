// What is known of committed results: which evaluations a second worker confirmed, which blocks were put right, and
// the simulations that are asked for again. Memory keeps a bounded number; the record has them all.

import { check } from '../../shared/check.js'
import { limits } from '../../shared/limits.js'
import { columnsOf } from '../evolution/estimate.js'
import type { Search } from '../evolution/search.js'
import type { Block, Individual } from '../evolution/types.js'
import type { RecordReader } from './ports.js'
import type { Rows } from './rows.js'
import { newWork, type Works } from './works.js'

/** Stands in the record where a worker's name would: nobody simulated this, it was given up. */
export const setAsideWorker = 'set-aside'

export interface ConfirmedParts {
  readonly search: Search
  readonly reader: RecordReader
  readonly works: Works
  readonly rows: Rows
}

/** A block of replicates of an individual. */
export interface BlockKey {
  readonly individual: number
  readonly firstReplicate: number
}

export class Confirmed {
  readonly #parts: ConfirmedParts
  /** Committed evaluations of the living that a second worker confirmed, by island. */
  readonly #evaluations = new Map<number, Set<number>>()
  #count = 0
  /** Blocks that were put right after their commit: two workers agreed on what stands there now. */
  readonly #corrected = new Set<string>()

  constructor(parts: ConfirmedParts) {
    this.#parts = parts
  }

  noteCorrected(block: BlockKey): void {
    this.#corrected.add(keyOf(block))
  }

  remember(island: number, evaluation: number): void {
    const known = this.#evaluations.get(island) ?? new Set<number>()
    this.#evaluations.set(island, known)
    if (known.has(evaluation)) return
    known.add(evaluation)
    this.#count++
  }

  /** Confirmations of the dead are in the record; memory keeps a bounded number. */
  prune(): void {
    if (this.#count < limits.confirmedInMemory) return
    this.#evaluations.clear()
    this.#count = 0
  }

  /** True when every result of the individual was confirmed; asks for what is missing. */
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
    if (this.#corrected.has(keyOf({ individual, firstReplicate }))) return true
    if (this.#evaluations.get(island)?.has(evaluation)) return true
    if (!this.#parts.reader.isConfirmed(island, evaluation)) return false
    this.remember(island, evaluation)
    return true
  }

  /** False for what was set aside: nobody simulated that, and nobody is asked to. */
  #simulateAgain(individual: Individual, block: Block, values: number): boolean {
    const { works, search, rows, reader } = this.#parts
    if (works.find(block.island, block.evaluation)) return true
    const recorded =
      rows.findArrival(block.island, block.evaluation) ?? reader.arrival(block.island, block.evaluation)
    check(recorded !== undefined, 'a committed result is in the record')
    if (recorded.worker === setAsideWorker) return false
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
    const executor = { kind: 'thread', worker: recorded.worker, host: recorded.host } as const
    work.votes.push({ result: recorded.result, digest: recorded.digest, executor })
    works.add(work)
    works.want(work, 'confirm')
    return true
  }
}

function keyOf({ individual, firstReplicate }: BlockKey): string {
  return `${individual} ${firstReplicate}`
}
