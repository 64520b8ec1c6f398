// Contestants side by side: each in a process of its own, warmed up, asked in turn to move its body for some
// milliseconds, in one order and then in the other. What counts is CPU time, and only ratios within a round: neighbours
// on the machine slow all of a round down, so the ratios stay.

import { type ChildProcessWithoutNullStreams, spawn, spawnSync } from 'node:child_process'
import { createInterface } from 'node:readline'
import { median } from '../statistics.js'

export interface Contestant {
  readonly name: string
  readonly program: string
  readonly args: readonly string[]
  /** Lines to send before anything else; each is answered by a line. */
  readonly opening: readonly string[]
  /** Replicates moved by one step. */
  readonly replicates: number
  /** Steps in a sample, at least. */
  readonly leastSteps: number
  /** CPU until the fast code is there. */
  readonly warmUpNanoseconds: number
  /** CPU of one sample. */
  readonly sampleNanoseconds: number
}

interface Runner {
  readonly contestant: Contestant
  readonly process: ChildProcessWithoutNullStreams
  readonly ask: (line: string) => Promise<string>
  stepsPerSample: number
}

/** Nanoseconds of CPU a step and replicate of every contestant, by name, one object a round. */
export type Rounds = readonly { readonly [name: string]: number }[]

/**
 * All on one processor, where the system can do that: on shared machines one is often half as fast as the next, for as
 * long as its neighbours are busy, and a process mostly stays where it is.
 */
const pinned = spawnSync('taskset', ['-c', '0', 'true']).status === 0 ? ['taskset', '-c', '0'] : []

export async function alternate(contestants: readonly Contestant[], count: number): Promise<Rounds> {
  const runners = contestants.map(start)
  try {
    for (const runner of runners) await warmUp(runner)
    const rounds: { [name: string]: number }[] = []
    for (let number = 0; number < count; number++) {
      const round: { [name: string]: number } = {}
      for (const runner of number % 2 === 0 ? runners : runners.toReversed()) {
        const nanoseconds = Number(await runner.ask(`run ${runner.stepsPerSample}`))
        round[runner.contestant.name] = nanoseconds / runner.stepsPerSample / runner.contestant.replicates
      }
      rounds.push(round)
    }
    return rounds
  } finally {
    for (const runner of runners) runner.process.stdin.end()
  }
}

/** Where all nodes of all replicates are after `steps` steps: to see that all contestants do the same. */
export async function stateAfter(contestant: Contestant, steps: number): Promise<number[]> {
  const runner = start(contestant)
  try {
    for (const line of contestant.opening) await runner.ask(line)
    await runner.ask(`run ${steps}`)
    return (await runner.ask('state')).trim().split(' ').map(Number)
  } finally {
    runner.process.stdin.end()
  }
}

function start(contestant: Contestant): Runner {
  const [program, ...args] = [...pinned, contestant.program, ...contestant.args] as [string, ...string[]]
  const child = spawn(program, args, { stdio: ['pipe', 'pipe', 'pipe'] })
  const lines = createInterface({ input: child.stdout })
  let errors = ''
  child.stderr.on('data', (data) => {
    errors += String(data)
  })
  const ask = (line: string) =>
    new Promise<string>((resolve, reject) => {
      const ended = (code: number | null) =>
        reject(new Error(`${contestant.name} ended with ${code} on '${line}': ${errors.slice(-2000)}`))
      child.once('exit', ended)
      lines.once('line', (answer) => {
        child.off('exit', ended)
        resolve(answer)
      })
      child.stdin.write(`${line}\n`)
    })
  return { contestant, process: child, ask, stepsPerSample: 0 }
}

/** Until the fast code is there; then finds how many steps a sample has. */
async function warmUp(runner: Runner): Promise<void> {
  const { opening, leastSteps, warmUpNanoseconds, sampleNanoseconds } = runner.contestant
  for (const line of opening) await runner.ask(line)
  let steps = leastSteps
  let spent = 0
  let last = 0
  while (spent < warmUpNanoseconds) {
    last = Number(await runner.ask(`run ${steps}`))
    spent += Math.max(last, 1e5)
    if (last < sampleNanoseconds / 2) steps *= 2
  }
  runner.stepsPerSample = Math.max(leastSteps, Math.round((steps * sampleNanoseconds) / last))
}

export interface Ratio {
  readonly median: number
  readonly p10: number
  readonly p90: number
}

/** How many times as fast `a` is as `b`: the median of the ratios of all rounds, and their spread. */
export function ratioOf(rounds: Rounds, a: string, b: string): Ratio {
  const ratios = rounds.map((round) => round[b]! / round[a]!).sort((x, y) => x - y)
  const at = (share: number) => ratios[Math.round(share * (ratios.length - 1))]!
  return { median: median(ratios), p10: at(0.1), p90: at(0.9) }
}

/** Too wide to be believed: measure again. */
export function isWide({ p10, p90 }: Ratio): boolean {
  return p90 / p10 > 1.25
}
