// Failed simulations in words: a failure is a result, and its reason is what a person needs.

import type { RecordReader } from '../../engine/ports.js'
import type { Island } from '../../evolution/island.js'
import type { Search } from '../../evolution/search.js'
import { grouped } from '../numbers.js'

/** How many failed; nothing where none did. */
export function failureLines(search: Search): string[] {
  const islands = search.islands.filter((island) => !island.isControl)
  const sum = (of: (island: Island) => number) => islands.reduce((total, island) => total + of(island), 0)
  const failed = sum((island) => island.counters.failedSimulations)
  if (failed === 0) return []
  const all = sum((island) => island.counters.committedSimulations)
  return [
    `  ${grouped(failed)} of the ${grouped(all)} simulations of the search failed; machines that fail rank last.`,
  ]
}

/** The summary of a search in which every machine failed. */
export function nothingFound(search: Search, reader: Pick<RecordReader, 'arrival'>): string[] {
  const because = firstFailure(search, reader)
  return [
    'No machine has been simulated without failure yet.',
    ...(because === undefined
      ? []
      : [
          `  The first failed because: ${because}.`,
          '  `skerry check FILE` tries a few machines and shows what goes wrong.',
        ]),
  ]
}

/** Why the first machine failed, in the words of its result. */
export function firstFailure(search: Search, reader: Pick<RecordReader, 'arrival'>): string | undefined {
  for (const island of search.islands) {
    const reason = reader.arrival(island.number, 1)?.result.failures[0]?.reason
    if (reason !== undefined) return reason.replace(/\.$/, '')
  }
  return undefined
}
