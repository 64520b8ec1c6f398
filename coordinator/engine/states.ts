// Snapshots read back: structured data from the record, checked as far as a wrong shape could do harm. A snapshot
// that does not fit is no loss: the journal leads to the same state.

import type { IslandState } from '../evolution/island-state.js'
import type { IslandPlan } from '../evolution/plan.js'
import type { RecordReader } from './ports.js'

/** The newest usable snapshot of every island. */
export function readStates(plans: readonly IslandPlan[], reader: RecordReader): Map<number, IslandState> {
  const states = new Map<number, IslandState>()
  for (const { island } of plans) {
    const snapshot = reader.snapshot(island)
    if (snapshot && isIslandState(snapshot.state) && snapshot.state.counters.commits === snapshot.commit) {
      states.set(island, snapshot.state)
    }
  }
  return states
}

function isIslandState(state: unknown): state is IslandState {
  return (
    typeof state === 'object' &&
    state !== null &&
    'counters' in state &&
    'individuals' in state &&
    Array.isArray(state.individuals) &&
    'tickets' in state &&
    Array.isArray(state.tickets) &&
    'machine' in state
  )
}
