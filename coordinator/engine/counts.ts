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
  }
}
