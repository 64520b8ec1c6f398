// `skerry rederive RECORD`: recomputes a search from its journal and compares every digest.

import { exitCodes } from '../../shared/refusals.js'
import type { Command, CommandInput } from './command.js'
import { openHouse } from './house.js'
import { counted } from './numbers.js'
import type { RederiveReport } from './run-options.js'
import { columns } from './searchfile/changes.js'
import { watch } from './watch.js'

export const rederiveCommand: Command = {
  name: 'rederive',
  summary:
    'Recompute a search from its journal and compare every digest; simulate some of it again if asked.',
  arguments: [{ name: 'RECORD', help: 'folder of the record' }],
  options: [
    {
      flag: '--resimulate',
      value: 'N',
      kind: 'count',
      help: 'also simulate N of its evaluations again, evenly chosen',
    },
    {
      flag: '--rewind',
      value: 'DIR',
      kind: 'text',
      help: 'begin the search again in a new record, from before its first wrong result, with all that is still believed',
    },
    {
      flag: '--cores',
      value: 'N',
      kind: 'count',
      help: 'simulations at once (default: every core of this machine)',
    },
  ],
  examples: [
    'skerry rederive records/culvert-crawler',
    'skerry rederive records/culvert-crawler --resimulate 200',
  ],
  run,
}

async function run(input: CommandInput): Promise<number> {
  const { output } = input
  const house = await openHouse()
  const shown = watch(output)
  const cores = input.counts['--cores']
  const rewind = input.texts['--rewind']
  const report = await house.rederive({
    record: input.arguments.RECORD!,
    resimulate: input.counts['--resimulate'] ?? 0,
    ...(cores === undefined ? {} : { cores }),
    ...(rewind === undefined ? {} : { rewind }),
    tell: shown.say,
    signal: output.signal,
  })
  if (output.json) {
    output.print(JSON.stringify({ agrees: true, ...report }, undefined, 2))
    return exitCodes.done
  }
  const rows = report.islands.map(({ name, commits, digest }) => [name, String(commits), digest.slice(0, 16)])
  output.print(columns([['island', 'commits', 'digest'], ...rows]))
  output.print(
    `The record agrees with its journal: ${counted(report.islands.length, 'island')}, search digest ${report.digest}.`,
  )
  if (report.resimulated > 0) {
    output.print(resimulatedLine(report))
  }
  return exitCodes.done
}

const howExact: { readonly [exactness in RederiveReport['exactness']]: string } = {
  bits: 'to the last bit',
  'bits-per-processor': 'to the last bit, on this class of processors',
  tolerance: "within the problem's tolerances",
  statistical: "within the problem's tolerances",
}

function resimulatedLine({ resimulated, agreed = resimulated, exactness }: RederiveReport): string {
  const all = `${counted(resimulated, 'evaluation')} simulated again`
  return agreed === resimulated
    ? `${all} gave the recorded numbers ${howExact[exactness]}.`
    : `${all}: ${agreed} gave the recorded numbers ${howExact[exactness]}; the problem promises no more than a likeness.`
}
