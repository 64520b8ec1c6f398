// How a search stands, and whether its record holds what it says: commands that look at a record and change nothing.

import { existsSync, readFileSync, statSync } from 'node:fs'
import { join } from 'node:path'
import { z } from 'zod'
import { hex } from '../../../shared/digests.js'
import { islandName } from '../../../shared/ids.js'
import { refuse } from '../../../shared/refusals.js'
import { loadPlugin } from '../../../worker/plugin/load.js'
import { replayRecord } from '../../engine/recover.js'
import { recordFolder } from '../../record/index.js'
import type { ProgressView } from '../progress-view.js'
import type { RederiveOptions, RederiveReport } from '../run-options.js'
import { finishedBecause } from './budget-ends.js'
import { placeOf } from './place.js'
import { resimulate, Sample } from './resimulate.js'
import { rewindInto } from './rewind.js'
import { withSilence } from './silence.js'
import { toolsOf } from './tools.js'
import { progressView } from './view.js'

/** What a coordinator that runs writes into the record's folder every second. */
export const progressFile = 'progress.json'

const shownSchema = z.looseObject({ state: z.string(), digest: z.string(), committed: z.number() })

/** How a search stands, without disturbing it: what its coordinator last showed, or the record itself when none runs. */
export async function readProgress(folder: string): Promise<ProgressView> {
  const place = placeOf(folder)
  const holder = place.exists() ? place.holder() : undefined
  if (holder && holder.running !== false) {
    const shown = shownProgress(folder)
    if (shown) return shown
  }
  const record = place.read()
  try {
    const problem = await loadPlugin({ code: new TextDecoder().decode(record.pluginCode) })
    const { search } = replayRecord(toolsOf(record.plan, problem), record.reader)
    const begun = search.islands.some((island) => island.counters.commits > 0)
    const ended = begun && search.islands.every((island) => island.ended)
    return progressView({
      search,
      reader: record.reader,
      folder,
      state: ended ? 'finished' : begun ? 'stopped' : 'new',
      ...(ended ? finishedBecause(record.reader) : begun ? { because: 'no coordinator runs it' } : {}),
    })
  } finally {
    record.close()
  }
}

function shownProgress(folder: string): ProgressView | undefined {
  const path = join(folder, progressFile)
  if (!existsSync(path) || statSync(path).size === 0) return undefined
  const parsed = shownSchema.safeParse(JSON.parse(readFileSync(path, 'utf8')))
  if (!parsed.success) return undefined
  // Written by a coordinator of this version or another: its own shape is the interface.
  const shown = parsed.data as unknown as ProgressView
  return withSilence(shown, (Date.now() - statSync(path).mtimeMs) / 1000)
}

/** Derives a search again from its journal, compares every digest, and simulates a sample again. */
export async function rederive(options: RederiveOptions): Promise<RederiveReport> {
  const record = placeOf(options.record).read()
  try {
    const verification = record.verify()
    if (!verification.intact) {
      throw refuse('record-corrupted', {
        detail: verification.sentences.join(' '),
        where: { file: recordFolder(options.record).database },
      })
    }
    for (const sentence of verification.sentences) options.tell(sentence)
    const problem = await loadPlugin({ code: new TextDecoder().decode(record.pluginCode) })
    const sample = new Sample(record.plan, options.resimulate)
    const { search, replay } = replayRecord(toolsOf(record.plan, problem), record.reader, {
      fromStart: true,
      onCommit: (island, ticket) => sample.offer(island, ticket),
    })
    options.tell(
      `${replay.commits} commits derived again, ${replay.digestsCompared} recorded digests compared and equal.`,
    )
    if (options.rewind !== undefined) {
      rewindInto(options.rewind, record, toolsOf(record.plan, problem), options.tell)
    }
    const resimulated = resimulate(record.plan, problem, record.reader, sample, options.signal)
    return {
      islands: search.islands.map((island) => ({
        name: islandName(island.number),
        commits: island.counters.commits,
        digest: hex(island.digest),
      })),
      digest: hex(search.digest()),
      resimulated: resimulated.of,
      agreed: resimulated.agreed,
      exactness: problem.exactness,
    }
  } finally {
    record.close()
  }
}
