// The table of figures: a row each. Adding one is adding a row; the runner (main.ts) repeats it, prints it and keeps it.

import { cpus, tmpdir } from 'node:os'
import { clusterFigures } from './cluster/figures.js'
import { type ContestSeed, contestMeasures } from './contest.js'
import type { CpuPart } from './crawler.js'
import { runDemo } from './demo.js'
import { kernelMeasures } from './kernel/figure.js'
import type { Measure } from './measure.js'
import { slope } from './statistics.js'
import { runTask } from './tasks.js'
import type { WholePath } from './whole-path.js'

export interface Round {
  readonly quick: boolean
  readonly number: number
  /** An empty folder, removed afterwards. */
  readonly folder: string
  readonly say: (sentence: string) => void
}

export interface Figure {
  readonly name: string
  readonly what: string
  readonly rounds: { readonly full: number; readonly quick: number }
  /** Which round counts: the best where others can only make it worse, else the median. */
  readonly takes: 'best' | 'median'
  /** False where a busy machine changes nothing. */
  readonly dependsOnTime: boolean
  /** One round; every round gives the same measures. */
  readonly run: (round: Round) => Promise<readonly Measure[]>
}

const threads = Math.min(2, cpus().length)
const megabyte = 1e6

export const figures: readonly Figure[] = [
  {
    name: 'engine',
    what: 'engine alone in memory: proposals, acceptance, ordered commits, SHA-256 by @noble/hashes',
    rounds: { full: 5, quick: 2 },
    takes: 'best',
    dependsOnTime: true,
    async run({ quick }) {
      const { result } = await runTask('engine', { commits: quick ? 200_000 : 400_000 })
      const remark = `${result.cpuMicrosecondsPerCommit.toFixed(2)} us CPU each`
      return [
        {
          name: 'engine alone',
          unit: 'commits/s',
          goal: { atLeast: 200_000 },
          value: result.commitsPerSecond,
          remark,
        },
      ]
    },
  },
  {
    name: 'whole-path',
    what: 'islands, engine, durable record, local dispatcher, threads; a trivial problem in batches',
    rounds: { full: 5, quick: 2 },
    takes: 'best',
    dependsOnTime: true,
    async run({ quick, folder }) {
      const evaluations = quick ? 100_000 : 300_000
      const { result } = await runTask('wholePath', {
        folder,
        evaluations,
        budget: 2 * evaluations,
        threads,
        sampleEvery: evaluations,
        goesOn: false,
      })
      return [
        {
          name: 'whole path',
          unit: 'evaluations/s',
          goal: { atLeast: 20_000 },
          value: result.evaluationsPerSecond,
          remark: wholePathRemark(result),
        },
      ]
    },
  },
  {
    name: 'overhead',
    what: 'CPU beyond simulation through the local dispatcher',
    rounds: { full: 5, quick: 2 },
    takes: 'best',
    dependsOnTime: true,
    async run({ quick }) {
      const { result } = await runTask('dispatch', { threads, evaluations: quick ? 50_000 : 200_000 })
      const { cpuMicrosecondsPerEvaluation: all, simulationMicrosecondsPerEvaluation: plain } = result
      return [
        {
          name: 'dispatch overhead',
          unit: 'us CPU/evaluation',
          goal: { atMost: 50 },
          value: result.overheadMicrosecondsPerEvaluation,
          remark: `${all.toFixed(1)} in all, ${plain.toFixed(1)} in a plain loop, ${result.evaluationsPerSecond.toFixed(0)} evaluations/s`,
        },
      ]
    },
  },
  {
    name: 'crawler-share',
    what: 'CPU in simulation / CPU in all, a real search of the crawler',
    rounds: { full: 1, quick: 1 },
    takes: 'median',
    dependsOnTime: true,
    async run({ quick, folder }) {
      const { result } = await runTask('crawler', { folder, simulations: quick ? 600 : 24_000, threads })
      const row = (name: string, { simulationSeconds, allSeconds }: CpuPart) => ({
        name: `crawler: simulation / all CPU, ${name}`,
        unit: '1',
        value: simulationSeconds / allSeconds,
        remark: `${simulationSeconds.toFixed(2)} / ${allSeconds.toFixed(2)} s`,
      })
      return [
        { ...row('after a third of the run', result.later), goal: { atLeast: 0.97 } },
        row('from the first simulation', result.whole),
      ]
    },
  },
  {
    name: 'record-bytes',
    what: 'bytes of the record for each evaluation, without genomes',
    rounds: { full: 1, quick: 1 },
    takes: 'best',
    dependsOnTime: false,
    async run({ quick }) {
      const numbers = 4
      const evaluations = quick ? 50_000 : 1_000_000
      const options = { evaluations, numbers, batch: 500, islands: 5, place: tmpdir() }
      const { result } = await runTask('record', options)
      return [
        {
          name: 'record, beside 8 bytes a number',
          unit: 'bytes/evaluation',
          goal: { atMost: 100 },
          value: result.bytesPerEvaluation - 8 * numbers,
          remark: `${evaluations} evaluations of ${numbers} numbers; append ${result.appendCpuMicroseconds.toFixed(1)} us CPU each`,
        },
      ]
    },
  },
  {
    name: 'continue',
    what: 'a search killed at work after a million evaluations, and continued',
    rounds: { full: 1, quick: 1 },
    takes: 'best',
    dependsOnTime: true,
    run: measureContinuing,
  },
  {
    name: 'demo',
    what: 'the demo on two cores, from start to end of the command',
    rounds: { full: 1, quick: 1 },
    takes: 'best',
    dependsOnTime: true,
    async run({ folder }) {
      const { seconds, cpuSeconds, said } = await runDemo(folder, threads)
      return [
        {
          name: 'demo',
          unit: 's',
          goal: { atMost: 90 },
          value: seconds,
          remark: `${cpuSeconds.toFixed(1)} s CPU; ${said}`,
        },
      ]
    },
  },
  {
    name: 'contest',
    what: 'the crawler against drift and random sampling at equal simulations, retested',
    rounds: { full: 1, quick: 1 },
    takes: 'best',
    dependsOnTime: false,
    async run({ quick, folder, say }) {
      const seeds: ContestSeed[] = []
      for (let seed = 1; seed <= (quick ? 2 : 10); seed++) {
        const options = { folder: `${folder}/${seed}`, seed, simulations: quick ? 300 : 3000, threads }
        const { result } = await runTask('contest', options)
        const { search, drift, randomSampling } = result.metres
        say(
          `seed ${seed}: search ${search.toFixed(3)} m, drift ${drift.toFixed(3)} m, random sampling ${randomSampling.toFixed(3)} m`,
        )
        seeds.push(result)
      }
      return contestMeasures(seeds)
    },
  },
  {
    name: 'kernel',
    what: 'the lattice kernel, the TypeScript reference and plain C in turn; ratios per replicate',
    rounds: { full: 3, quick: 1 },
    takes: 'median',
    // Ratios within a round, measured again where they are spread widely.
    dependsOnTime: false,
    run: ({ quick, folder, say }) => kernelMeasures(folder, quick, say),
  },
  ...clusterFigures,
]

function wholePathRemark(path: WholePath): string {
  const { coordinatorCpuMicroseconds: own, allCpuMicroseconds: all, evaluations, appends } = path
  const confirmed = ((100 * path.confirmations) / evaluations).toFixed(1)
  return `${own.toFixed(1)} us CPU in the coordinator, ${all.toFixed(1)} in all; ${(evaluations / appends).toFixed(0)} evaluations an append; ${confirmed} % confirmed`
}

async function measureContinuing({ quick, folder, say }: Round): Promise<readonly Measure[]> {
  const evaluations = quick ? 200_000 : 1_000_000
  const budget = 2 * evaluations
  const sampleEvery = evaluations / 20
  const options = { folder, evaluations, budget, threads, sampleEvery, goesOn: true }
  const { result: made } = await runTask('wholePath', options, { killed: true })
  say(
    `made ${made.evaluations} evaluations, ${made.evaluationsPerSecond.toFixed(0)} a second, then killed it`,
  )
  const late = made.memory.filter((one) => one.evaluations >= evaluations / 5)
  const growth = slope(late.map((one) => [one.evaluations, one.residentBytes]))
  const starts = []
  for (let i = 0; i < 3; i++) {
    const { result } = await runTask('continuing', { folder, budget, threads }, { killed: true })
    starts.push(result)
  }
  const best = starts.reduce((a, b) => (b.seconds < a.seconds ? b : a))
  const peaks = starts.map(({ peakBytes }) => (peakBytes / megabyte).toFixed(0))
  const residents = late.map(({ residentBytes }) => (residentBytes / megabyte).toFixed(0))
  const live = made.memory.flatMap(({ liveBytes }) =>
    liveBytes === undefined ? [] : [(liveBytes / megabyte).toFixed(1)],
  )
  const range = evaluations - evaluations / 5
  return [
    {
      name: `continuing ${evaluations} evaluations: to the first dispatch`,
      unit: 's',
      goal: { atMost: 5 },
      value: best.seconds,
      remark: `of ${starts.map(({ seconds }) => seconds.toFixed(2)).join(', ')}; ${best.cpuSeconds.toFixed(2)} s CPU; ${best.replayedCommits} commits derived again`,
    },
    {
      name: 'continuing: most memory of the coordinator',
      unit: 'MB',
      goal: { atMost: 250 },
      value: Math.max(...starts.map(({ peakBytes }) => peakBytes)) / megabyte,
      remark: `peaks ${peaks.join(', ')}`,
    },
    {
      name: `memory at work, from ${evaluations / 5} to ${evaluations} evaluations: fitted growth`,
      unit: 'MB',
      // Less than the memory breathes between two collections of garbage.
      goal: { atMost: 10 },
      value: (growth * range) / megabyte,
      remark: `${growth.toFixed(2)} bytes an evaluation; MB on the way: ${residents.join(' ')}; live after a collection: ${live.join(' and ')} MB`,
    },
  ]
}
