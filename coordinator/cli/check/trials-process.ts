// The trials of `check` in a process of their own: a problem that hangs, ends the process or eats memory does it
// there, and the report names the machine that was being simulated.

import { spawn } from 'node:child_process'
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { genomeFromBytes } from '../../../shared/encodings.js'
import type { AnyProblem } from '../../../shared/problem.js'
import { emittedFile } from '../../../worker/entry.js'
import type { StepTrial } from './step.js'
import type { ProblemFault, TrialPlan, Trials } from './trials.js'
import {
  type TrialsDone,
  type TrialsLine,
  type TrialsOrder,
  trialsLine,
  unpackValues,
} from './trials-wire.js'

const childFile = 'coordinator/cli/check/trials-child.js'

export interface TriedMemory {
  /** Largest resident size of the trial process. */
  readonly peakBytes: number
  /** Beyond the process before its first simulation. */
  readonly addedBytes: number
}

export type ProcessTrials = Trials & { readonly memory?: TriedMemory }

/** Runs the trials; gives a machine up that takes longer than `waitSeconds` for one evaluation. */
export async function tryInProcess(
  problem: AnyProblem,
  code: string,
  plan: TrialPlan,
  waitSeconds: number,
): Promise<ProcessTrials> {
  const child = emittedFile(childFile.replace(/\.js$/, ''))
  const folder = mkdtempSync(join(tmpdir(), 'skerry-check-'))
  try {
    const bundle = join(folder, 'plugin.mjs')
    writeFileSync(bundle, code)
    const told = await askChild(child, { bundle, plan }, waitSeconds)
    return told.done ? unpack(problem, told.done) : ended(told, waitSeconds)
  } finally {
    rmSync(folder, { recursive: true, force: true })
  }
}

function unpack(problem: AnyProblem, done: TrialsDone): ProcessTrials {
  const { machines, peakBytes, baseBytes } = done
  return {
    faults: done.faults,
    failed: done.failed,
    simulations: done.simulations,
    failedBecause: done.failedBecause,
    ...(done.keptBytesPerSimulation === undefined
      ? {}
      : { keptBytesPerSimulation: done.keptBytesPerSimulation }),
    ...(done.step === undefined ? {} : { step: done.step as StepTrial }),
    machines: machines.map(({ genome, values, failures, faults, ...machine }) => ({
      ...machine,
      genome: genomeFromBytes(problem.genome, new Uint8Array(Buffer.from(genome, 'base64'))),
      first: { values: unpackValues(values), failures, faults },
    })),
    memory: { peakBytes, addedBytes: Math.max(0, peakBytes - baseBytes) },
  }
}

/** The process did not come to its end: what it was doing then is the fault. */
function ended({ last, ending, words }: Told, waitSeconds: number): ProcessTrials {
  const what =
    last === undefined || last.machine === 0
      ? 'the problem was being loaded'
      : `machine ${last.machine} was being simulated`
  const how =
    ending === 'too long'
      ? `it was not done after ${waitSeconds} s (--wait N waits longer), while ${what}`
      : `it ended its process (${ending}) while ${what}`
  const fault: ProblemFault = {
    kind: 'problem-throws',
    sentence: `${how}.${words === '' ? '' : ` Last words: ${words}`}`,
  }
  return { machines: [], faults: [fault], failed: 0, simulations: 0, failedBecause: undefined }
}

interface Told {
  readonly done: TrialsDone | undefined
  readonly last: Extract<TrialsLine, { kind: 'begin' }> | undefined
  /** 'exit code 3', 'signal SIGABRT', 'too long' */
  readonly ending: string
  readonly words: string
}

const wordsLength = 300

function askChild(file: string, order: TrialsOrder, waitSeconds: number): Promise<Told> {
  return new Promise((resolve) => {
    const child = spawn(process.execPath, ['--expose-gc', file], {
      stdio: ['pipe', 'ignore', 'pipe', 'pipe'],
    })
    let done: TrialsDone | undefined
    let last: Told['last']
    let isTooLong = false
    let words = ''
    let rest = ''
    let timer = setTimeout(giveUp, waitSeconds * 1000)
    function giveUp(): void {
      isTooLong = true
      child.kill('SIGKILL')
    }
    child.stdio[3]!.on('data', (chunk: Buffer) => {
      clearTimeout(timer)
      timer = setTimeout(giveUp, waitSeconds * 1000)
      const lines = (rest + chunk.toString()).split('\n')
      rest = lines.pop()!
      for (const line of lines) {
        const parsed = trialsLine.parse(JSON.parse(line))
        if (parsed.kind === 'done') done = parsed
        else last = parsed
      }
    })
    child.stderr!.on('data', (chunk: Buffer) => {
      words = lastWords(words + chunk.toString())
    })
    child.stdin!.on('error', () => {})
    const settle = (ending: string) => {
      clearTimeout(timer)
      resolve({ done, last, ending: isTooLong ? 'too long' : ending, words: isTooLong ? '' : words.trim() })
    }
    child.on('error', (error) => settle(error.message))
    child.on('close', (exitCode, signal) =>
      settle(exitCode === null ? `signal ${signal}` : `exit code ${exitCode}`),
    )
    child.stdin!.end(JSON.stringify(order))
  })
}

/** The line of a fatal error of the engine where there is one, else the end of what was said. */
function lastWords(text: string): string {
  const fatal = /FATAL ERROR: .*/.exec(text)
  return fatal ? `${fatal[0].slice(0, wordsLength)}\n` : text.slice(-wordsLength)
}
