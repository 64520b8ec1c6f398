// `skerry preflight`: is this site fit? Versions, limits, the folder of records, Redis. Every line that is not good
// says how to mend it.

import { defaultPrefix } from '../../shared/cluster/keys.js'
import { exitCodes, Refusal } from '../../shared/refusals.js'
import { addressVariable, certificateVariable, parseAddress } from '../../worker/redis/index.js'
import type { Command, CommandInput } from './command.js'
import { judgeFolder } from './preflight/folder.js'
import { bad, drawLines, type Line } from './preflight/line.js'
import { judgeMachine, machineFacts } from './preflight/machine.js'
import { judgeRedis } from './preflight/redis.js'

export const preflightCommand: Command = {
  name: 'preflight',
  summary: 'Check the site: machine, folder of records, Redis; say how to mend what is wrong.',
  arguments: [],
  options: [
    {
      flag: '--record',
      value: 'DIR',
      kind: 'text',
      help: 'folder where records shall lie (default ./records)',
    },
    {
      flag: '--redis',
      value: 'URL',
      kind: 'text',
      help: `check this Redis too (default: ${addressVariable}, which other users of the machine cannot see)`,
    },
  ],
  examples: [
    'skerry preflight',
    'skerry preflight --record /shared/records --redis redis://queue.example.org',
  ],
  run,
}

interface Group {
  readonly name: string
  readonly lines: readonly Line[]
}

async function run(input: CommandInput): Promise<number> {
  const { output } = input
  const folder = input.texts['--record'] ?? 'records'
  const groups: Group[] = [
    { name: 'This machine', lines: judgeMachine(machineFacts()) },
    { name: `Records in ${folder}`, lines: judgeFolder(folder) },
  ]
  const url = input.texts['--redis'] ?? process.env[addressVariable]
  if (url !== undefined && url !== '') groups.push({ name: 'Redis', lines: await lookAtRedis(url) })
  const wrong = groups.flatMap(({ lines }) => lines).filter(({ status }) => status === 'bad').length
  if (output.json) {
    output.print(JSON.stringify({ fit: wrong === 0, groups }, undefined, 2))
  } else {
    for (const { name, lines } of groups) output.print([...drawLines(name, lines), ''].join('\n'))
    const redis = groups.length > 2 ? '' : ' Redis was not looked at: name it with --redis URL.'
    const verdict =
      wrong === 0 ? 'Fit for a search.' : `${wrong === 1 ? 'One thing' : `${wrong} things`} to mend first.`
    output.print(verdict + redis)
  }
  return wrong === 0 ? exitCodes.done : exitCodes.configuration
}

async function lookAtRedis(url: string): Promise<Line[]> {
  // Loaded only where a Redis is named: the client takes a while to load.
  const { inspectRedis } = await import('../../worker/redis/inspect.js')
  try {
    const address = parseAddress(url, process.env[certificateVariable])
    return judgeRedis(await inspectRedis(address, defaultPrefix, Date.now))
  } catch (error) {
    if (!(error instanceof Refusal)) throw error
    return [bad('reached', error.message, error.cure)]
  }
}
