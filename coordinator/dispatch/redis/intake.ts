// What comes back: deliveries of the results stream become facts. Whatever does not fit (bytes, record, problem,
// shape) is counted, acknowledged and otherwise ignored: anybody who reaches the server can write there.

import type { Answer, Answers } from '../../../shared/cluster/codec.js'
import { type LossMessage, protocolVersion } from '../../../shared/cluster/messages.js'
import type { DispatchFact, WorkItem } from '../../../shared/result.js'
import type { Book } from './book.js'
import type { Counters } from './counters.js'
import type { JobPace } from './pace.js'
import type { Delivery } from './port.js'

/** What the results of this problem look like. */
export interface Shape {
  /** Declared numbers: objectives and measures. */
  readonly columns: number
  /** Simulations of one replicate: the number of cases, at least 1. */
  readonly cases: number
}

interface IntakeParts {
  readonly search: { readonly search: string; readonly record: string; readonly pluginDigest: string }
  readonly shape: Shape
  readonly book: Book
  readonly pace: JobPace
  readonly counters: Counters
  /** Whether this coordinator gave that number to a job. */
  readonly isOurs: (dispatch: number) => boolean
}

export class Intake {
  readonly #parts: IntakeParts
  /** Given out and not acknowledged yet: the server delivers them again after a lost connection. */
  readonly #inHand = new Set<string>()

  constructor(parts: IntakeParts) {
    this.#parts = parts
  }

  take(deliveries: readonly Delivery[]): { readonly facts: DispatchFact[]; readonly receipts: string[] } {
    const facts: DispatchFact[] = []
    const receipts: string[] = []
    for (const { receipt, answers } of deliveries) {
      if (this.#inHand.has(receipt)) continue
      this.#inHand.add(receipt)
      receipts.push(receipt)
      if (answers === undefined) this.#parts.counters.malformed++
      else if (!this.#isOfThisSearch(answers)) this.#parts.counters.foreign++
      else facts.push(...this.#factsOf(answers))
    }
    return { facts, receipts }
  }

  acknowledged(receipts: readonly string[]): void {
    for (const receipt of receipts) this.#inHand.delete(receipt)
  }

  #isOfThisSearch({ header }: Answers): boolean {
    const { search, record, pluginDigest } = this.#parts.search
    return (
      header.protocol === protocolVersion &&
      header.search === search &&
      header.record === record &&
      header.pluginDigest === pluginDigest
    )
  }

  #factsOf({ answers, losses }: Answers): DispatchFact[] {
    return [
      ...answers.flatMap((answer) => this.#result(answer) ?? []),
      ...losses.flatMap((loss) => this.#loss(loss) ?? []),
    ]
  }

  #result(answer: Answer): DispatchFact | undefined {
    const { book, pace, counters, isOurs } = this.#parts
    if (!isOurs(answer.dispatch)) {
      // Of an earlier coordinator: which work that number named is not known here.
      counters.foreign++
      return undefined
    }
    const item = book.find(answer.item)
    if (!this.#fits(answer, item)) {
      counters.malformed++
      return undefined
    }
    if (item) {
      book.answer(item)
      counters.answers++
      pace.note(item, answer.wallSeconds)
    } else counters.late++
    const { result, digest, executor, cpuSeconds, wallSeconds } = answer
    return { kind: 'result', item: answer.item, result, digest, executor, cpuSeconds, wallSeconds }
  }

  /** Rows and columns as declared; for a late answer, whose item is forgotten, columns only. */
  #fits({ result }: Answer, item: WorkItem | undefined): boolean {
    const { columns, cases } = this.#parts.shape
    const simulations = result.values.length / columns
    if (!Number.isInteger(simulations / cases) || simulations === 0) return false
    if (item && simulations !== item.replicates * cases) return false
    return result.failures.every(({ simulation }) => simulation < simulations)
  }

  #loss({ dispatch, index, cause, detail, executor }: LossMessage): DispatchFact | undefined {
    const { book, counters } = this.#parts
    const item = book.answerPlace(dispatch, index)
    if (!item) {
      counters.late++
      return undefined
    }
    const { island, evaluation, attempt, purpose, isolation } = item
    const { processor, ...rest } = executor
    const named = processor === undefined ? rest : { ...rest, processor }
    return {
      kind: 'lost',
      item: { island, evaluation, attempt, purpose, isolation },
      cause,
      detail,
      executor: named,
    }
  }
}
