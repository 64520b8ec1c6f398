// From a record to a running engine: snapshots, then the journal behind them, then the engine. A fresh record is
// the same with nothing in it.

import type { Island } from '../evolution/island.js'
import { Search, type SearchTools } from '../evolution/search.js'
import type { Ticket } from '../evolution/tickets.js'
import { Engine, type EngineOptions } from './engine.js'
import type { RecordReader } from './ports.js'
import { ReplayGate, type ReplayProgress } from './replay.js'
import { readStates } from './states.js'
import { Schedule } from './world-facts.js'

/** The search as the record has it, and what it took to get there. */
export interface Recovered {
  readonly search: Search
  readonly schedule: Schedule
  readonly replay: ReplayProgress
}

/**
 * Brings a search to the end of its journal. Without `fromStart` the newest snapshots are used.
 * @throws Refusal record-differs or record-corrupted when the journal does not lead where it says.
 */
export function replayRecord(
  tools: SearchTools,
  reader: RecordReader,
  {
    fromStart = false,
    onCommit,
  }: { fromStart?: boolean; onCommit?: (island: Island, ticket: Ticket) => void } = {},
): Recovered {
  const states = fromStart ? new Map() : readStates(tools.plan, reader)
  const search = new Search(tools, states, (island, epoch) => reader.mail(island, epoch))
  const schedule = new Schedule()
  for (const event of reader.events()) {
    const fact = schedule.addRecorded(event)
    if (fact?.fact.fact === 'budget' && fact.fact.silentFrom > 0) {
      search.post.silence(event.island, fact.fact.silentFrom, fact.fact.epoch)
    }
  }
  for (const island of search.islands) {
    const last = reader.lastMail(island.number)
    // From the start, an island says by itself that it ended; from a snapshot it may have said so before it.
    if (last?.ended && island.ended) search.post.put(last)
  }
  const gate = new ReplayGate(search, reader, schedule, onCommit)
  gate.run()
  return { search, schedule, replay: gate.progress }
}

/** An engine that goes on where the record stands. */
export function openEngine(
  tools: SearchTools,
  reader: RecordReader,
  options: EngineOptions,
): { readonly engine: Engine; readonly replay: ReplayProgress } {
  const { search, schedule, replay } = replayRecord(tools, reader)
  const engine = new Engine(search, schedule, reader, options)
  for (const mail of replay.unsent) engine.sent(mail)
  return { engine, replay }
}
