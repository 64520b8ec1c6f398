// A sample of a record's simulations, run once more: reservoir sampling (Vitter, Random sampling with a
// reservoir, 1985, algorithm R) over the commits as they are derived again, so that memory does not grow with them.

import { resultDigest } from '../../../shared/digests.js'
import { genomeFromBytes } from '../../../shared/encodings.js'
import { agree, ruleOf } from '../../../shared/exactness.js'
import { islandName, nameOf } from '../../../shared/ids.js'
import type { AnyProblem } from '../../../shared/problem.js'
import { refuse } from '../../../shared/refusals.js'
import { type Stream, stream } from '../../../shared/streams.js'
import { evaluate } from '../../../sim/evaluate.js'
import { setAsideWorker } from '../../engine/confirmed.js'
import type { ArrivalRow, RecordReader } from '../../engine/ports.js'
import type { Island } from '../../evolution/island.js'
import type { SearchPlan } from '../../evolution/plan.js'
import type { Ticket } from '../../evolution/tickets.js'

interface Drawn {
  readonly island: number
  readonly evaluation: number
  readonly individual: number
  readonly firstReplicate: number
  readonly replicates: number
  readonly genome: Uint8Array
}

export class Sample {
  readonly #size: number
  readonly #draw: Stream
  readonly #drawn: Drawn[] = []
  #seen = 0

  /** `size` evaluations at most; the same record gives the same sample. */
  constructor(plan: SearchPlan, size: number) {
    this.#size = size
    this.#draw = stream(plan.seed, 'check', 1)
  }

  offer(island: Island, ticket: Ticket): void {
    this.#seen++
    const place = this.#drawn.length < this.#size ? this.#drawn.length : this.#draw.below(this.#seen)
    if (place >= this.#size) return
    this.#drawn[place] = {
      island: island.number,
      evaluation: ticket.evaluation,
      individual: ticket.individual.id,
      firstReplicate: ticket.firstReplicate,
      replicates: ticket.replicates,
      genome: ticket.genome,
    }
  }

  drawn(): readonly Drawn[] {
    return this.#drawn
  }
}

/**
 * Simulates the sample again and compares, as exactly as the problem promises. Returns how many agreed of how many;
 * what was set aside cannot be simulated and is passed over.
 * @throws Refusal results-disagree, unless the problem promises no more than a likeness
 */
export function resimulate(
  plan: SearchPlan,
  problem: AnyProblem,
  reader: RecordReader,
  sample: Sample,
  signal: AbortSignal,
): { readonly agreed: number; readonly of: number } {
  let agreed = 0
  let of = 0
  for (const one of sample.drawn()) {
    if (signal.aborted) break
    const recorded = reader.arrival(one.island, one.evaluation)
    if (!recorded || recorded.worker === setAsideWorker) continue
    const again = evaluate(
      problem,
      genomeFromBytes(plan.problem.spec, one.genome),
      plan.seed,
      plan.replicates.shared,
      one.individual,
      one.firstReplicate,
      one.replicates,
    )
    of++
    if (agree(plan.problem, { result: again, digest: resultDigest(again) }, recorded)) agreed++
    else if (ruleOf(plan.problem).convicts) throw differs(plan, one, recorded)
  }
  return { agreed, of }
}

function differs(plan: SearchPlan, one: Drawn, { worker, processor }: ArrivalRow): Error {
  const onClass =
    ruleOf(plan.problem).oneProcessorClass && processor !== undefined
      ? `; it was simulated on a processor of class ${processor}, and only that class must give it again`
      : ''
  return refuse('results-disagree', {
    detail: `evaluation ${one.evaluation} of ${islandName(one.island)} (${nameOf(one.individual)}), simulated by ${worker}, gives another result here${onClass}`,
  })
}
