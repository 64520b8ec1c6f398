// `skerry rederive RECORD --rewind DIR`: a search that wrong machines misled, begun again in a new record with every
// result that is still believed.

import { randomBytes } from 'node:crypto'
import { existsSync } from 'node:fs'
import { islandName } from '../../../shared/ids.js'
import { refuse } from '../../../shared/refusals.js'
import type { Append } from '../../engine/ports.js'
import { openEngine } from '../../engine/recover.js'
import { KnownResults, rewind } from '../../engine/rewind.js'
import type { SearchTools } from '../../evolution/search.js'
import { openRecord, type readRecord, recordFolder, thisProcess } from '../../record/index.js'

type ReadableRecord = Pick<ReturnType<typeof readRecord>, 'plan' | 'searchText' | 'pluginCode' | 'reader'>

/** Makes the new record; says what was used again and where the first doubt is. @throws Refusal usage */
export function rewindInto(
  folder: string,
  record: ReadableRecord,
  tools: SearchTools,
  tell: (sentence: string) => void,
): void {
  if (existsSync(recordFolder(folder).database)) {
    throw refuse('usage', {
      detail: `--rewind ${folder}: there is a record already; name a folder that has none`,
    })
  }
  const known = new KnownResults(tools, record.reader)
  const { plan, searchText, pluginCode } = record
  const begun = openRecord(folder, {
    create: { plan, searchText, pluginCode },
    holder: thisProcess(),
    nonce: randomBytes(16).toString('hex'),
    clock: Date.now,
    takeover: 'if-dead',
  })
  try {
    if (known.decided.length > 0) begun.journal.append({ ...nothing, events: known.decided })
    const options = { leaseMs: Number.POSITIVE_INFINITY, snapshotCommits: 10_000 }
    const { engine } = openEngine(tools, begun.reader, options)
    engine.note('rewound', 'Begun again from a record that used wrong results, with those that are believed.')
    const used = rewind(engine, known, begun.journal)
    const doubts = known.doubtful.map(({ island, commit }) => `${islandName(island)} at commit ${commit}`)
    tell(
      doubts.length === 0
        ? 'Nothing in this record is doubtful: the new record is the same search.'
        : `The first doubtful results were committed by ${doubts.join(', ')}.`,
    )
    const commits = engine.search.islands.reduce((sum, { counters }) => sum + counters.commits, 0)
    tell(
      `${used} answers were used again and ${commits} evaluations committed in ${folder}. To go on: skerry run FILE --record ${folder}`,
    )
  } finally {
    begun.close()
  }
}

const nothing: Append = {
  arrivals: [],
  confirmations: [],
  births: [],
  commits: [],
  mail: [],
  events: [],
  snapshots: [],
}
