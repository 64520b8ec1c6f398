// `skerry progress RECORD`: how a search stands, whether or not its coordinator runs.

import { setTimeout as sleep } from 'node:timers/promises'
import { exitCodes } from '../../shared/refusals.js'
import type { Command, CommandInput } from './command.js'
import { openHouse } from './house.js'
import { drawProgress } from './terminal.js'
import { timeOfDay, watch } from './watch.js'

const everyMs = 1000

export const progressCommand: Command = {
  name: 'progress',
  summary: 'Show how a search stands; on a terminal, keep showing it.',
  arguments: [{ name: 'RECORD', help: 'folder of the record' }],
  options: [{ flag: '--once', kind: 'switch', help: 'show it once, also on a terminal' }],
  examples: ['skerry progress records/culvert-crawler', 'skerry progress records/culvert-crawler --json'],
  run,
}

async function run(input: CommandInput): Promise<number> {
  const { output } = input
  const record = input.arguments.RECORD!
  const house = await openHouse()
  let view = await house.readProgress(record)
  if (output.json) {
    output.print(JSON.stringify(view, undefined, 2))
    return exitCodes.done
  }
  if (!output.isTerminal || input.switches['--once']) {
    const options = {
      columns: output.columns,
      unicode: output.unicode,
      islandsMost: 1000,
      clockAfter: timeOfDay,
    }
    output.print(drawProgress(view, options).join('\n'))
    return exitCodes.done
  }
  const shown = watch(output)
  while (!output.signal.aborted) {
    shown.show(view)
    if (view.state === 'finished' || view.state === 'stopped') break
    await sleep(everyMs, undefined, { signal: output.signal }).catch(() => {})
    view = await house.readProgress(record)
  }
  return exitCodes.done
}
