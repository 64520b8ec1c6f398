// Drives the islands of a search without any engine: results are made up by the test and are there at once, unless
// they are withheld. A test says what a simulation gives and looks on.

import type { Island } from '../coordinator/evolution/island.js'
import type { SearchPlan } from '../coordinator/evolution/plan.js'
import { type Gate, Search, type SearchTools, type Standing } from '../coordinator/evolution/search.js'
import type { Ticket } from '../coordinator/evolution/tickets.js'
import { resultDigest } from '../shared/digests.js'
import type { EvaluationResult } from '../shared/result.js'
import { fixtureTools, simulated } from './fixture.js'

/** A gate that opens everything, with parts of it replaced. */
export function gateOf(
  resultOf: (island: Island, ticket: Ticket) => EvaluationResult | undefined,
  changes: Partial<Gate> = {},
): Gate {
  return {
    outcome: (island, ticket) => {
      const result = resultOf(island, ticket)
      return result && { result, digest: resultDigest(result) }
    },
    nextArrival: (island) => island.outstanding()[0]?.evaluation,
    mayCommit: () => true,
    maySend: () => true,
    factWhileWaiting: () => false,
    factsBeforeSending: () => {},
    factsAtEpoch: () => {},
    released: () => {},
    committed: () => {},
    sent: () => {},
    ...changes,
  }
}

/** Results of the fixture's problem. */
export const fixtureResults =
  (plan: SearchPlan) =>
  (_island: Island, { individual, firstReplicate, replicates }: Ticket): EvaluationResult =>
    simulated(plan, individual.genome, firstReplicate, replicates)

/** Moves every island until none can move, again and again where the gate withholds. */
export function runToEnd(search: Search, gate: Gate, looksMost = 100_000): Map<number, Standing> {
  for (let look = 0; look < looksMost; look++) {
    const standing = search.advanceAll(gate)
    if ([...standing.values()].every((one) => one === 'ended')) return standing
  }
  throw new Error('the search does not end')
}

/** A search of this plan, driven to its end. */
export function drivenSearch(plan: SearchPlan, gate: Gate, tools: SearchTools = fixtureTools(plan)): Search {
  const search = new Search(tools)
  runToEnd(search, gate)
  return search
}
