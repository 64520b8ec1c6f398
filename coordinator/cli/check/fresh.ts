// The same machines simulated once more in a process that has just begun: finds what depends on the warmth of the
// process (caches, compiled code, what was loaded before). The child is this file's neighbour fresh-child.ts.

import { spawn } from 'node:child_process'
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { z } from 'zod'
import { genomeBytes } from '../../../shared/encodings.js'
import type { AnyProblem } from '../../../shared/problem.js'
import { Refusal } from '../../../shared/refusals.js'
import { emittedFile } from '../../../worker/entry.js'
import { differences, type Machine, type ProblemFault, type TrialPlan } from './trials.js'
import { failureList, unpackValues } from './trials-wire.js'

/** What the child is asked and what it answers, as JSON on its standard input and output. */
export interface FreshOrder {
  readonly bundle: string
  readonly plan: TrialPlan
  readonly machines: readonly { readonly number: number; readonly genome: string }[]
}
export const freshAnswer = z.array(
  z.strictObject({
    number: z.number().int(),
    /** Doubles, little-endian, base64. */
    values: z.string(),
    failures: failureList,
  }),
)

const childFile = 'coordinator/cli/check/fresh-child.js'

export interface FreshOutcome {
  readonly faults: readonly ProblemFault[]
  /** Why it was not done, for a person. */
  readonly notRun?: string
}

/** Faults that only a fresh process shows. */
export async function tryFresh(
  problem: AnyProblem,
  code: string,
  plan: TrialPlan,
  machines: readonly Machine[],
  waitSeconds: number,
): Promise<FreshOutcome> {
  let child: string
  try {
    child = emittedFile(childFile.replace(/\.js$/, ''))
  } catch (error) {
    if (error instanceof Refusal) return { faults: [], notRun: error.detail }
    throw error
  }
  const folder = mkdtempSync(join(tmpdir(), 'skerry-check-'))
  try {
    const bundle = join(folder, 'plugin.mjs')
    writeFileSync(bundle, code)
    const order: FreshOrder = {
      bundle,
      plan,
      machines: machines.map(({ number, genome }) => ({
        number,
        genome: Buffer.from(genomeBytes(problem.genome, genome)).toString('base64'),
      })),
    }
    return compare(problem, machines, await askChild(child, JSON.stringify(order), waitSeconds))
  } finally {
    rmSync(folder, { recursive: true, force: true })
  }
}

function compare(problem: AnyProblem, machines: readonly Machine[], answer: string): FreshOutcome {
  const parsed = freshAnswer.safeParse(parseJson(answer))
  if (!parsed.success) {
    return {
      faults: [
        {
          kind: 'problem-throws',
          sentence: `the fresh process answered nothing usable: ${answer.slice(0, 200)}`,
        },
      ],
    }
  }
  const faults = machines.flatMap((machine) => {
    const other = parsed.data.find(({ number }) => number === machine.number)
    if (!other) return []
    const values = unpackValues(other.values)
    return differences(
      problem,
      machine,
      machine.first,
      { values, failures: other.failures, faults: [] },
      'in a fresh process',
    )
  })
  return { faults: faults.slice(0, 3) }
}

function parseJson(text: string): unknown {
  try {
    return JSON.parse(text)
  } catch {
    return undefined
  }
}

function askChild(file: string, order: string, waitSeconds: number): Promise<string> {
  return new Promise((resolve) => {
    const child = spawn(process.execPath, [file], {
      stdio: ['pipe', 'pipe', 'pipe'],
      timeout: waitSeconds * 1000,
      killSignal: 'SIGKILL',
    })
    let answer = ''
    let complaint = ''
    child.stdout.on('data', (chunk: Buffer) => {
      answer += chunk.toString()
    })
    child.stderr.on('data', (chunk: Buffer) => {
      complaint = (complaint + chunk.toString()).slice(-2000)
    })
    child.stdin.on('error', () => {})
    child.on('error', (error) => resolve(error.message))
    child.on('close', (code) =>
      resolve(
        code === 0
          ? answer
          : complaint || (code === null ? 'it was not done in time' : `it ended with exit code ${code}`),
      ),
    )
    child.stdin.end(order)
  })
}
