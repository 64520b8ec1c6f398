// A search file that was edited since its record was begun: what differs, what may be taken, and the facts that
// follow for the running search.

import { z } from 'zod'
import { islandName } from '../../../shared/ids.js'
import { refuse } from '../../../shared/refusals.js'
import type { Engine } from '../../engine/engine.js'
import type { RecordReader } from '../../engine/ports.js'
import type { IslandPlan } from '../../evolution/plan.js'
import { type ChangeRowFound, diffSearchFiles, printChanges } from '../searchfile/changes.js'
import type { OpenedSearch } from '../searchfile/open.js'

const changedSchema = z.object({ searchText: z.string() })
const changedKind = 'search-file-changed'

/** The search file's text as the record last accepted it. */
export function acceptedText(reader: RecordReader, pinnedText: string): string {
  let text = pinnedText
  for (const event of reader.events()) {
    if (event.kind === changedKind) text = changedSchema.parse(event.data).searchText
  }
  return text
}

/** Changes that concern the search; free ones are simply used. Refuses those that need a record of their own. */
export function judgeChanges(
  file: string,
  oldText: string,
  newText: string,
  accept: boolean,
  tell: (changes: readonly ChangeRowFound[]) => void,
): readonly ChangeRowFound[] {
  const changes = diffSearchFiles(oldText, newText)
  const binding = changes.filter((change) => change.kind !== 'free')
  if (binding.length === 0) return []
  tell(changes)
  const branches = binding.filter((change) => change.kind === 'branch')
  if (branches.length > 0) {
    throw refuse('changed-search-file', {
      detail: `${branches.map((change) => change.field).join(', ')} cannot be changed in a running search`,
      where: {
        file,
        line: branches[0]!.place.line,
        column: branches[0]!.place.column,
        field: branches[0]!.field,
      },
      cure: `Put ${branches.length === 1 ? 'it' : 'them'} back, or begin a new search with --record and another folder.\n${printChanges(file, changes)}`,
    })
  }
  if (!accept) {
    throw refuse('changed-search-file', {
      detail: `${binding.map((change) => change.field).join(', ')} would take effect at the end of the next epoch`,
      where: {
        file,
        line: binding[0]!.place.line,
        column: binding[0]!.place.column,
        field: binding[0]!.field,
      },
      cure: 'Run the same command with --accept-changes to take the differences, or put the file back.',
    })
  }
  return binding
}

/** Orders what the accepted changes say, and writes down the text they come from. */
export function orderChanges(
  engine: Engine,
  changes: readonly ChangeRowFound[],
  { fields, plan, text: searchText }: Pick<OpenedSearch, 'fields' | 'plan' | 'text'>,
): void {
  if (changes.length === 0) return
  engine.note(changedKind, `The search file was changed: ${changes.map(sentenceOf).join('; ')}.`, {
    searchText,
  })
  const touched = (field: string) => changes.some((change) => change.field.startsWith(field))
  if (touched('budget.simulations')) {
    const { simulations } = fields.budget
    engine.orderBudget(`The budget is ${simulations} simulations from now on.`, simulations)
  }
  if (touched('islands')) orderIslands(engine, plan.islands)
  if (touched('replicates.most')) {
    const most = fields.replicates.most ?? fields.replicates.first
    engine.orderAtEpoch(
      'replicates-changed',
      `An individual gets at most ${most} replicates from now on.`,
      () => ({
        fact: 'most-replicates',
        most,
      }),
    )
  }
}

/** Islands at the end of the list that are new, gone (paused) or back. */
function orderIslands(engine: Engine, wanted: readonly IslandPlan[]): void {
  const known = engine.search.islandPlans.length
  const active = wanted.map(({ island }) => island)
  const paused = engine.search.islandPlans.filter(({ island }) => !active.includes(island))
  const added = wanted.slice(known)
  const parts = [
    ...(added.length > 0 ? [`${added.map(({ island }) => islandName(island)).join(', ')} added`] : []),
    ...(paused.length > 0 ? [`${paused.map(({ island }) => islandName(island)).join(', ')} paused`] : []),
  ]
  const sentence = `Islands from now on: ${active.length} take part${parts.length > 0 ? ` (${parts.join('; ')})` : ''}.`
  engine.orderMembership(sentence, active, added)
}

function sentenceOf(change: ChangeRowFound): string {
  return `${change.field} from ${change.old} to ${change.new}`
}
