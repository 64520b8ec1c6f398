// What the benchmark runs in processes of its own, so that no figure inherits the memory, the garbage or the compiled
// code of another. A task is a function from plain data to plain data.

import { fork } from 'node:child_process'
import { fileURLToPath } from 'node:url'
import { spareHelpersOfCoordinator } from '../../worker/thrift.js'
import { runBare, serveBare } from './cluster/bare.js'
import { holdAgents, runCrowd } from './cluster/crowd.js'
import { measureMemory } from './cluster/memory.js'
import { runClusterPath } from './cluster/whole.js'
import { runContest } from './contest.js'
import { continueRecord } from './continuing.js'
import { runCrawler } from './crawler.js'
import { benchDispatch } from './dispatch.js'
import { benchEngine } from './engine.js'
import { cpuSecondsOfEnded } from './processes.js'
import { measureRecord, type RecordSizeOptions } from './record-size.js'
import { runWholePath } from './whole-path.js'

export const tasks = {
  engine: async ({ commits }: { readonly commits: number }) => benchEngine(commits, 2),
  dispatch: ({ threads, evaluations }: { readonly threads: number; readonly evaluations: number }) =>
    benchDispatch(threads, evaluations, 1),
  record: async (options: RecordSizeOptions) => measureRecord(options),
  wholePath: runWholePath,
  continuing: continueRecord,
  crawler: runCrawler,
  contest: runContest,
  bare: runBare,
  bareWorker: serveBare,
  clusterPath: runClusterPath,
  redisMemory: measureMemory,
  crowd: runCrowd,
  crowdAgents: holdAgents,
}
export type TaskName = keyof typeof tasks
type Options<Name extends TaskName> = Parameters<(typeof tasks)[Name]>[0]
type Result<Name extends TaskName> = Awaited<ReturnType<(typeof tasks)[Name]>>

export interface Done<Name extends TaskName> {
  readonly result: Result<Name>
  /** Of its process and all that it started, from beginning to end. */
  readonly cpuSeconds: number
}

/** One task at a time: the CPU of its family is told by what the kernel adds up when it has ended. */
export function runTask<Name extends TaskName>(
  name: Name,
  options: Options<Name>,
  { killed = false }: { readonly killed?: boolean } = {},
): Promise<Done<Name>> {
  const before = cpuSecondsOfEnded()
  return new Promise((resolve, reject) => {
    const child = fork(fileURLToPath(new URL('./main.js', import.meta.url)), ['--task', name], {
      execArgv: ['--expose-gc'],
    })
    let result: { readonly value: Result<Name> } | undefined
    child.on('message', (value) => {
      result = { value: value as Result<Name> }
      // As preemption does it: without a chance to put anything in order.
      if (killed) child.kill('SIGKILL')
    })
    child.on('exit', (code, signal) => {
      if (result) resolve({ result: result.value, cpuSeconds: cpuSecondsOfEnded() - before })
      else reject(new Error(`the task ${name} ended with ${signal ?? `exit code ${code}`} and no result`))
    })
    child.send(options as object)
  })
}

/** The other end: waits for the options, runs the task, tells its result. */
export function serveTask(name: string): void {
  // As the program itself does.
  spareHelpersOfCoordinator()
  const task = tasks[name as TaskName] as (options: never) => Promise<unknown>
  // Whoever asked is gone, or has its answer.
  process.on('disconnect', () => process.exit())
  process.once('message', async (options) => {
    process.send?.(await task(options as never), () => process.disconnect())
  })
}
