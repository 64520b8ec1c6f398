// From a record to a running engine: snapshots, then the journal behind them, then the engine. A fresh record is
// the same with nothing in it.

import type { Island } from '../evolution/island.js'
import { type Membership, Search, type SearchTools } from '../evolution/search.js'
import type { Ticket } from '../evolution/tickets.js'
import { Engine, type EngineOptions } from './engine.js'
import type { RecordReader } from './ports.js'
import { ReplayGate, type ReplayProgress } from './replay.js'
import { readStates } from './states.js'
import { Schedule, type WorldFact } from './world-facts.js'

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
  const schedule = new Schedule()
  const facts = [...reader.events()].flatMap((event) => {
    const data = schedule.addRecorded(event)
    return data ? [{ island: event.island, fact: data.fact }] : []
  })
  const memberships = membershipsOf(facts.map(({ fact }) => fact))
  const plans = [...tools.plan.islands, ...memberships.flatMap(({ added }) => added), ...tools.plan.controls]
  const states = fromStart ? new Map() : readStates(plans, reader)
  const search = new Search(tools, states, (island, epoch) => reader.mail(island, epoch))
  for (const membership of memberships) search.changeMembership(membership)
  for (const { island, fact } of facts) {
    if (fact.fact !== 'budget') continue
    search.noteBudget(fact.simulations)
    if (fact.silentFrom > 0) search.post.silence(island, fact.silentFrom, fact.epoch)
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

/** One fact is written down for every island it concerns; a membership holds for all. */
function membershipsOf(facts: readonly WorldFact[]): Membership[] {
  const byEpoch = new Map<number, Membership>()
  for (const fact of facts) if (fact.fact === 'islands') byEpoch.set(fact.epoch, fact)
  return [...byEpoch.values()].sort((a, b) => a.epoch - b.epoch)
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
