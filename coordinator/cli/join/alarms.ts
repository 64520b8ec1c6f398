// What somebody who looks at a running search should be told without asking, once: that everything fails, that
// evaluations are set aside, that nothing returns any more. Sentences only; nothing here changes the search.

import type { RecordReader } from '../../engine/ports.js'
import type { Search } from '../../evolution/search.js'
import { counted, duration, grouped } from '../numbers.js'
import type { ProgressView } from '../progress-view.js'
import { firstFailure } from './failures.js'

/** Simulations before their failures are called a pattern. */
const failuresLeast = 20
const quietSeconds = 60

export class Alarms {
  readonly #search: Search
  readonly #reader: Pick<RecordReader, 'arrival' | 'totals' | 'events'>
  readonly #nowMs: () => number
  #saidFailing = false
  /** Evaluations set aside before the next word about them: 1, 10, 100 ... */
  #nextSetAside = 1
  #arrivals = -1
  #lastArrivalMs: number
  #saidQuiet = false

  /** `nowMs` is monotonic. What a record held before is no news. */
  constructor(
    search: Search,
    reader: Pick<RecordReader, 'arrival' | 'totals' | 'events'>,
    nowMs: () => number,
  ) {
    this.#search = search
    this.#reader = reader
    this.#nowMs = nowMs
    this.#lastArrivalMs = nowMs()
  }

  /** What is new since the last look. */
  look(view: ProgressView): string[] {
    return [...this.#failing(view), ...this.#setAside(view), ...this.#quiet(view)]
  }

  #failing({ simulations, failedSimulations }: ProgressView): string[] {
    if (this.#saidFailing || simulations < failuresLeast || failedSimulations < simulations) return []
    this.#saidFailing = true
    const because = firstFailure(this.#search, this.#reader)
    return [
      `All ${grouped(simulations)} simulations so far have failed${because === undefined ? '' : `, the first because: ${because}`}. Ctrl-C stops the search; \`skerry check FILE\` shows what goes wrong.`,
    ]
  }

  #setAside({ setAside }: ProgressView): string[] {
    if (setAside < this.#nextSetAside) return []
    while (this.#nextSetAside <= setAside) this.#nextSetAside *= 10
    let last = ''
    for (const event of this.#reader.events()) if (event.kind === 'set-aside') last = event.sentence
    return [
      `${counted(setAside, 'evaluation has', 'evaluations have')} been set aside as failed, because every try was lost. The last: ${last}`,
    ]
  }

  #quiet(view: ProgressView): string[] {
    const { arrivals } = this.#reader.totals()
    const nowMs = this.#nowMs()
    if (arrivals !== this.#arrivals || view.state !== 'searching') {
      this.#arrivals = arrivals
      this.#lastArrivalMs = nowMs
      this.#saidQuiet = false
      return []
    }
    const seconds = (nowMs - this.#lastArrivalMs) / 1000
    if (this.#saidQuiet || seconds < quietSeconds) return []
    this.#saidQuiet = true
    return [
      `No result has come for ${duration(seconds)}. Simulations may be slow; one that hangs is stopped and tried again after 20 times its expected time, or after 10 minutes as long as no time is known.`,
    ]
  }
}
