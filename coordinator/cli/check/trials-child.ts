// The process in which `check` tries a problem (see trials-process.ts): loads the bundle, runs the trials, answers on file
// descriptor 3, one JSON object a line, written at once: the last line before a death tells what was running.

import { readFileSync, writeSync } from 'node:fs'
import { genomeBytes } from '../../../shared/encodings.js'
import { loadPlugin } from '../../../worker/plugin/load.js'
import { tryProblem } from './trials.js'
import { packValues, type TrialsLine, type TrialsOrder } from './trials-wire.js'

const answers = 3

function answer(line: TrialsLine): void {
  writeSync(answers, `${JSON.stringify(line)}\n`)
}

/** CPU time of this process: what else the machine does then hardly counts. */
function cpuSeconds(): number {
  const { user, system } = process.cpuUsage()
  return (user + system) / 1e6
}

/** What is still held after a full collection; needs --expose-gc. */
function keptBytes(): number {
  globalThis.gc?.()
  const { heapUsed, external } = process.memoryUsage()
  return heapUsed + external
}

const order = JSON.parse(readFileSync(0, 'utf8')) as TrialsOrder
answer({ kind: 'begin', machine: 0, run: 0 })
const problem = await loadPlugin({ file: order.bundle })
const baseBytes = process.memoryUsage().rss
const trials = tryProblem(problem, order.plan, cpuSeconds, {
  begin: (machine, run) => answer({ kind: 'begin', machine, run }),
  keptBytes,
})
const { machines, ...rest } = trials
answer({
  kind: 'done',
  ...rest,
  machines: machines.map(({ genome, first, ...machine }) => ({
    ...machine,
    genome: Buffer.from(genomeBytes(problem.genome, genome)).toString('base64'),
    values: packValues(first.values),
    failures: first.failures,
    faults: first.faults,
  })),
  peakBytes: process.resourceUsage().maxRSS * 1024,
  baseBytes,
})
// Whatever the problem left running ends here.
process.exit(0)
