// What comes back: deliveries of the results stream become facts. Whatever does not fit (bytes, record, problem,
// shape) is counted, acknowledged and otherwise ignored: anybody who reaches the server can write there.

import { type Answer, type Answers, contentWord } from '../../../shared/cluster/codec.js'
import { type LossMessage, protocolVersion } from '../../../shared/cluster/messages.js'
import type { DispatchFact, WorkItem } from '../../../shared/result.js'
import type { Book, ItemName } from './book.js'
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

/** Answers to an earlier coordinator's jobs that are kept at most. */
const leftMost = 100_000

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
  /** Answers to jobs of an earlier coordinator of this record, by work, until that is handed over here. */
  readonly #left = new Map<string, { readonly answer: Answer; readonly receipt: string }>()
  /** How many of them came with which delivery. */
  readonly #leftOf = new Map<string, number>()

  constructor(parts: IntakeParts) {
    this.#parts = parts
  }

  take(deliveries: readonly Delivery[]): { readonly facts: DispatchFact[]; readonly receipts: string[] } {
    const facts: DispatchFact[] = []
    const receipts: string[] = []
    for (const { receipt, answers } of deliveries) {
      if (this.#inHand.has(receipt)) continue
      this.#inHand.add(receipt)
      const left = this.#left.size
      if (answers === undefined) this.#parts.counters.malformed++
      else if (!this.#isOfThisSearch(answers)) this.#parts.counters.foreign++
      else facts.push(...this.#factsOf(answers, receipt))
      // What waits for its work to be handed over is acknowledged with it.
      if (this.#left.size === left) receipts.push(receipt)
    }
    return { facts, receipts }
  }

  /**
   * Of the items that are just handed over, those that an earlier coordinator's job has answered: they need not be
   * sent.
   */
  inherit(items: readonly WorkItem[]): { readonly facts: DispatchFact[]; readonly receipts: string[] } {
    const facts: DispatchFact[] = []
    const receipts: string[] = []
    if (this.#left.size === 0) return { facts, receipts }
    for (const item of items) {
      const left = this.#left.get(workName(item))
      if (!left || !this.#isAnswerTo(left.answer, item)) continue
      this.#left.delete(workName(item))
      if (this.#isLast(left.receipt)) receipts.push(left.receipt)
      facts.push(this.#inherited(left.answer, item))
    }
    return { facts, receipts }
  }

  /** True when nothing of that delivery is left after this one. */
  #isLast(receipt: string): boolean {
    const count = (this.#leftOf.get(receipt) ?? 0) - 1
    if (count > 0) this.#leftOf.set(receipt, count)
    else this.#leftOf.delete(receipt)
    return count <= 0
  }

  /** Nobody asked for these: their work is done. Receipts to acknowledge. */
  letGo(): string[] {
    const receipts = [...this.#leftOf.keys()]
    this.#parts.counters.foreign += this.#left.size
    this.#left.clear()
    this.#leftOf.clear()
    return receipts
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

  #factsOf({ answers, losses }: Answers, receipt: string): DispatchFact[] {
    return [
      ...answers.flatMap((answer) => this.#result(answer, receipt) ?? []),
      ...losses.flatMap((loss) => this.#loss(loss) ?? []),
    ]
  }

  #result(answer: Answer, receipt: string): DispatchFact | undefined {
    const { book, pace, counters, isOurs } = this.#parts
    if (!isOurs(answer.dispatch)) return this.#resultOfEarlier(answer, receipt)
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

  /** To a job of an earlier coordinator: its number says nothing here, what was simulated does. */
  #resultOfEarlier(answer: Answer, receipt: string): DispatchFact | undefined {
    const { book, counters } = this.#parts
    const item = book.findAnyTry(answer.item)
    if (item && this.#isAnswerTo(answer, item)) return this.#inherited(answer, item)
    const name = workName(answer.item)
    const isOfUse = !item && answer.content !== undefined && !this.#left.has(name)
    if (isOfUse && this.#left.size < leftMost) {
      this.#left.set(name, { answer, receipt })
      this.#leftOf.set(receipt, (this.#leftOf.get(receipt) ?? 0) + 1)
    } else counters.foreign++
    return undefined
  }

  #isAnswerTo(answer: Answer, item: WorkItem): boolean {
    return answer.content === contentWord(item) && this.#fits(answer, item)
  }

  #inherited({ result, digest, executor, cpuSeconds, wallSeconds }: Answer, item: WorkItem): DispatchFact {
    const { book, counters, pace } = this.#parts
    book.answer(item)
    counters.inherited++
    pace.note(item, wallSeconds)
    const { island, evaluation, attempt, purpose } = item
    const name = { island, evaluation, attempt, purpose }
    return { kind: 'result', item: name, result, digest, executor, cpuSeconds, wallSeconds }
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

function workName({ island, evaluation, purpose }: ItemName): string {
  return `${island}/${evaluation}/${purpose}`
}
