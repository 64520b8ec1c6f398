// Counters of the engine for people and metrics; none of them changes the search.

export interface EngineCounts {
  results: number
  duplicates: number
  late: number
  losses: number
  setAside: number
  confirmations: number
  disagreements: number
  corrections: number
  resent: number
  /** Second simulations by why they were asked for: chosen by hash; would-be bests, emigrants and what is reported;
   * differences and what somebody not believed any more had simulated. */
  spotChecks: number
  bestChecks: number
  rechecks: number
  /** Second tries of what blocked an island for too long, and those that answered first. */
  hedges: number
  hedgesFirst: number
}

export function newCounts(): EngineCounts {
  return {
    results: 0,
    duplicates: 0,
    late: 0,
    losses: 0,
    setAside: 0,
    confirmations: 0,
    disagreements: 0,
    corrections: 0,
    resent: 0,
    spotChecks: 0,
    bestChecks: 0,
    rechecks: 0,
    hedges: 0,
    hedgesFirst: 0,
  }
}
