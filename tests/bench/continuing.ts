// A coordinator was killed; another one continues its record. How long from the start of the process until the first
// piece of work goes out, and how much memory that takes.

import { readFileSync } from 'node:fs'
import { openBenchSearch } from './search.js'
import { trivialSearch } from './whole-path.js'

export interface Continuing {
  /** From the start of the process until the first work was handed to a pool that was ready. */
  readonly seconds: number
  /** CPU of the coordinator in that time. */
  readonly cpuSeconds: number
  readonly replayedCommits: number
  readonly peakBytes: number
}

/** Ends at the first dispatch; the caller ends the process, so that the record can be continued once more. */
export async function continueRecord(options: {
  readonly folder: string
  readonly budget: number
  readonly threads: number
}): Promise<Continuing> {
  // What `skerry run` loads, so that loading is part of the time.
  await Promise.all([import('../../coordinator/cli/table.js'), import('../../coordinator/main.js')])
  const parts = await openBenchSearch(options.folder, trivialSearch(options.budget), options)
  await parts.dispatcher.start()
  return new Promise((resolve, reject) => {
    const { dispatcher } = parts
    dispatcher.submit = () => {
      const { user, system } = process.cpuUsage()
      resolve({
        seconds: performance.now() / 1000,
        cpuSeconds: (user + system) / 1e6,
        replayedCommits: parts.replayed,
        peakBytes: peakBytes(),
      })
    }
    parts.run().catch(reject)
  })
}

/** The most memory this process has held at once (Linux). */
function peakBytes(): number {
  const kilobytes = /^VmHWM:\s+(\d+) kB$/m.exec(readFileSync('/proc/self/status', 'utf8'))?.[1]
  return Number(kilobytes) * 1024
}
