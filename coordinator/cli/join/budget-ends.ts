// Budgets that only the world knows: hours of cores and a date. They enter as journalled facts at an epoch. A search
// that they ended goes on when an accepted change of the file gives it more.

import type { Engine } from '../../engine/engine.js'
import type { RecordReader } from '../../engine/ports.js'
import type { ChangeRowFound } from '../searchfile/changes.js'
import type { SearchFile } from '../searchfile/schema.js'

export interface BudgetEnds {
  readonly coreHours: number | undefined
  readonly until: string | undefined
  /** They have been ordered to end the search, and nothing has made it go on since. */
  isOrdered: boolean
}

/**
 * Hours and date as the file says now: what differs from the record's copy was accepted. Lets a search that they ended
 * go on when they were changed.
 */
export function resumeEnds(
  engine: Pick<Engine, 'orderBudget'>,
  reader: Pick<RecordReader, 'events'>,
  changes: readonly Pick<ChangeRowFound, 'field'>[],
  { coreHours, until, simulations }: SearchFile['budget'],
): BudgetEnds {
  const isChanged = (name: string) => changes.some(({ field }) => field === `budget.${name}`)
  const wasEnded = isEndedByThem(reader)
  const hasNewEnds = isChanged('coreHours') || isChanged('until')
  if (wasEnded && hasNewEnds && !isChanged('simulations')) {
    // The same simulations once more: islands that were ended early go on where they have some left.
    engine.orderBudget('Hours or date were changed: the search goes on.', simulations)
  }
  return { coreHours, until, isOrdered: wasEnded && !hasNewEnds && !isChanged('simulations') }
}

/** Hours or a date ended the search, and no other budget came after. */
function isEndedByThem(reader: Pick<RecordReader, 'events'>): boolean {
  let isEnded = false
  for (const { kind } of reader.events()) {
    if (kind === 'budget-used') isEnded = true
    else if (kind === 'budget-changed') isEnded = false
  }
  return isEnded
}

/** Ends the search at the next epoch when hours are used or the date has come, once. */
export function orderBudgetEnds(
  engine: Pick<Engine, 'orderAtEpoch'>,
  reader: Pick<RecordReader, 'totals'>,
  ends: BudgetEnds,
  nowMs: number,
): void {
  if (ends.isOrdered) return
  const because = reached(reader, ends, nowMs)
  if (because === undefined) return
  ends.isOrdered = true
  engine.orderAtEpoch('budget-used', `The search finishes with the epoch, because ${because}.`, (epoch) => ({
    fact: 'finish',
    epoch,
  }))
}

function reached(
  reader: Pick<RecordReader, 'totals'>,
  { coreHours, until }: BudgetEnds,
  nowMs: number,
): string | undefined {
  if (coreHours !== undefined && reader.totals().cpuSeconds / 3600 >= coreHours) {
    return `${coreHours} core-hours are used`
  }
  return until !== undefined && nowMs >= Date.parse(until) ? `it is ${until}` : undefined
}

/** Why a search ended before its simulations were used, where that was an event. */
export function finishedBecause(reader: Pick<RecordReader, 'events'>): { readonly because?: string } {
  let because: string | undefined
  for (const { kind, sentence } of reader.events()) {
    if (kind === 'target-reached' || kind === 'budget-used') because = sentence.replace(/\.$/, '')
    else if (kind === 'budget-changed') because = undefined
  }
  return because === undefined ? {} : { because }
}
