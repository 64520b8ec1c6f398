// `skerry run FILE`: starts the search, or continues it. The same command after a preemption.

import { exitCodes, refuse } from '../../shared/refusals.js'
import { addressVariable } from '../../worker/redis/address.js'
import type { Command, CommandInput, OptionRow, Output } from './command.js'
import { openHouse } from './house.js'
import type { RunEnd, RunEvent, RunOptions } from './run-options.js'
import { printChanges } from './searchfile/changes.js'
import { printFindings } from './searchfile/finding.js'
import { fitted } from './terminal.js'
import { type Watch, watch } from './watch.js'

export const runOptionRows: readonly OptionRow[] = [
  { flag: '--record', value: 'DIR', kind: 'text', help: 'folder of the record (default ./records/NAME)' },
  {
    flag: '--cores',
    value: 'N',
    kind: 'count',
    help: 'simulations at once (default: every core of this machine)',
  },
  {
    flag: '--stop-after',
    value: 'N',
    kind: 'count',
    help: 'stop at this many simulations; running on later gives the same result',
  },
  {
    flag: '--accept-changes',
    kind: 'switch',
    help: 'go on with a search file that was edited since the record was begun',
  },
  {
    flag: '--force',
    kind: 'switch',
    help: 'take the record over from a coordinator that holds it; that one can write no more',
  },
  {
    flag: '--scratch',
    value: 'DIR',
    kind: 'text',
    help: 'keep the record as a journal that a shared folder can hold, with a work copy in DIR on this machine',
  },
  {
    flag: '--standby',
    kind: 'switch',
    help: 'wait until the coordinator that holds the record is gone, then go on in its place',
  },
]

const clusterOptionRows: readonly OptionRow[] = [
  {
    flag: '--redis',
    value: 'URL',
    kind: 'text',
    help: `let workers simulate that take their work from this Redis, redis://HOST:PORT (default: the variable ${addressVariable}, which hides a password)`,
  },
  {
    flag: '--own-redis',
    kind: 'switch',
    help: 'start a Redis for this search alone, which ends with it; workers find it with: skerry work --record DIR',
  },
  {
    flag: '--address',
    value: 'NAME',
    kind: 'text',
    help: 'with --own-redis: name or address under which workers reach this machine (default: its host name)',
  },
  {
    flag: '--redis-unprotected',
    kind: 'switch',
    help: 'take a Redis that other machines reach without a password',
  },
  {
    flag: '--key',
    value: 'FILE',
    kind: 'text',
    help: 'key of this site: sign the problem, for workers that run nothing unsigned',
  },
]

export const runCommand: Command = {
  name: 'run',
  summary: 'Start a search, or continue it where it stopped.',
  arguments: [{ name: 'FILE', help: 'the search file' }],
  options: [...runOptionRows, ...clusterOptionRows],
  examples: [
    'skerry run search.yaml',
    'skerry run search.yaml --cores 8 --stop-after 20000',
    'skerry run search.yaml --redis redis://queue.works.example',
    'skerry run search.yaml --record /shared/culvert --scratch /tmp --own-redis',
  ],
  run: (input) =>
    runAndReport(input, input.arguments.FILE!, input.texts['--record'], process.env[addressVariable]),
}

/**
 * Runs the search of `file` with the options given, shows it, and reports its end. `usualRedis`: where no --redis is
 * given, and there is one for this command.
 */
export async function runAndReport(
  input: CommandInput,
  file: string,
  record: string | undefined,
  usualRedis?: string,
): Promise<number> {
  const { output } = input
  const ownRedis = input.switches['--own-redis'] ?? false
  const redis = redisOf(input, ownRedis, usualRedis)
  const house = await openHouse()
  const shown = watch(output)
  const options: RunOptions = {
    file,
    ...given('record', record),
    ...given('cores', input.counts['--cores']),
    ...given('stopAfter', input.counts['--stop-after']),
    acceptChanges: input.switches['--accept-changes'] ?? false,
    force: input.switches['--force'] ?? false,
    ...given('scratch', input.texts['--scratch']),
    standby: input.switches['--standby'] ?? false,
    ...given('redis', redis),
    ownRedis,
    ...given('address', input.texts['--address']),
    redisUnprotected: input.switches['--redis-unprotected'] ?? false,
    ...given('keyFile', input.texts['--key']),
    tell: (event) => hear(event, shown, output),
    signal: output.signal,
  }
  const end = await house.runSearch(options)
  shown.end(end.view)
  reportEnd(output, end)
  return end.ended === 'interrupted' ? exitCodes.interrupted : exitCodes.done
}

/** @throws Refusal 'usage' for two of them */
function redisOf(input: CommandInput, ownRedis: boolean, usual: string | undefined): string | undefined {
  const named = input.texts['--redis']
  if (ownRedis && named !== undefined)
    throw refuse('usage', { detail: '--redis and --own-redis; expected one of the two' })
  if (!ownRedis && input.texts['--address'] !== undefined)
    throw refuse('usage', { detail: '--address without --own-redis' })
  const redis = ownRedis ? undefined : (named ?? usual)
  return redis === '' ? undefined : redis
}

function given<Name extends string, Value>(name: Name, value: Value | undefined): { [key in Name]?: Value } {
  return (value === undefined ? {} : { [name]: value }) as { [key in Name]?: Value }
}

function hear(event: RunEvent, shown: Watch, output: Output): void {
  if (event.kind === 'progress') shown.show(event.view)
  else if (event.kind === 'said') shown.say(event.sentence)
  else if (event.kind === 'warned') output.note(printFindings(event.file, event.findings))
  else
    shown.say(
      `The search file was edited since the record was begun:\n${printChanges(event.file, event.changes)}`,
    )
}

const endWords: { readonly [ended in RunEnd['ended']]: string } = {
  finished: 'The search is finished; the same command shows this again.',
  'stop-after': 'Stopped where --stop-after asked for; the same command without it goes on from here.',
  interrupted: 'Interrupted; nothing is lost. The same command goes on from here.',
}

function reportEnd(output: Output, end: RunEnd): void {
  if (output.json) {
    output.print(
      JSON.stringify({ ended: end.ended, ...end.view, summary: end.summary, files: end.files }, undefined, 2),
    )
    return
  }
  const say = (line: string) => output.print(output.isTerminal ? fitted(line, output.columns - 1) : line)
  output.print('')
  for (const line of end.brief) say(line)
  const width = Math.max(0, ...end.files.map(({ what }) => what.length))
  for (const { what, path } of end.files) output.print(`  ${what.padEnd(width)}  ${path}`)
  if (end.view.purity !== 'none') for (const fact of end.view.purity) say(`Entered from outside: ${fact}`)
  say(endWords[end.ended])
}
