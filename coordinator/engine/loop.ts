// The coordinator's loop over its ports: facts in, rows made durable, work out, in that order and no other. It is
// the one asynchronous place of the engine; clock and waiting are handed in.

import { Refusal } from '../../shared/refusals.js'
import type { DispatchFact } from '../../shared/result.js'
import type { Engine } from './engine.js'
import type { Dispatcher, Journal } from './ports.js'

export interface LoopWorld {
  readonly journal: Journal
  readonly dispatcher: Dispatcher
  /** Monotonic milliseconds. */
  readonly nowMs: () => number
  /** Resolves after about that long, or at once when `signal` is aborted. */
  readonly pause: (ms: number) => Promise<void>
  readonly signal: AbortSignal
  /** Called after every durable step: for progress, and for orders from outside. */
  readonly onStep: (state: LoopState) => void
}

export type LoopState =
  | { readonly kind: 'searching' }
  | { readonly kind: 'paused'; readonly refusal: Refusal }

export type LoopEnd = 'finished' | 'rested' | 'interrupted'

/** How long the loop waits for a fact before it looks at the clock again. */
const factWaitMs = 250
/** How long it waits before it tries a full disk again. */
const diskRetryMs = 1000

/**
 * Runs until the search has finished or rests, or the signal is aborted. While the disk is full nothing moves and
 * nothing is acknowledged; the same rows are tried again until there is room.
 * @throws Refusal for everything else the record refuses: nothing was acknowledged after it.
 */
export async function runLoop(engine: Engine, world: LoopWorld): Promise<LoopEnd> {
  let facts: DispatchFact[] = []
  // What was noted while the record was opened.
  if (!(await makeDurable(engine, world))) return 'interrupted'
  for (;;) {
    engine.take(facts, world.nowMs())
    if (!(await makeDurable(engine, world))) return 'interrupted'
    world.onStep({ kind: 'searching' })
    if (!(await makeDurable(engine, world))) return 'interrupted'
    const status = engine.status()
    if (status !== 'running') break
    if (world.signal.aborted) break
    const items = engine.work(world.dispatcher.status().wanted, world.nowMs())
    if (items.length > 0) world.dispatcher.submit(items)
    facts = await world.dispatcher.facts(factWaitMs)
  }
  engine.snapshotAll()
  if (!(await makeDurable(engine, world))) return 'interrupted'
  const status = engine.status()
  return status === 'running' ? 'interrupted' : status
}

/** False when the signal came while the disk was full: what is not durable is simulated again next time. */
async function makeDurable(engine: Engine, world: LoopWorld): Promise<boolean> {
  for (let rows = engine.rows(); rows; rows = engine.rows()) {
    try {
      world.journal.append(rows)
      engine.appended()
    } catch (fault) {
      if (!(fault instanceof Refusal) || fault.code !== 'disk-full') throw fault
      world.onStep({ kind: 'paused', refusal: fault })
      if (world.signal.aborted) return false
      await world.pause(diskRetryMs)
    }
  }
  return true
}
