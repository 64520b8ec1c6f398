// A plug-in is loaded in a thread of its own before this process takes it in: what loops, ends the process or eats
// memory while it is loaded does so there, and is refused in words. What it throws is left to the real load.

import { Worker } from 'node:worker_threads'
import { refuse } from '../../../shared/refusals.js'

/** Common practice, no source: bundles with wasm load in well under a second. */
export interface LoadLimits {
  readonly seconds: number
  readonly megabytes: number
}
const defaultLimits: LoadLimits = { seconds: 30, megabytes: 1024 }

const threadText = `
const { parentPort, workerData } = require('node:worker_threads')
const over = () => parentPort.postMessage('over')
import(workerData).then(over, over)
`

/** Refuses with problem-throws a bundle whose top level does not come to an end by itself. */
export async function tryLoad(code: string, limits: LoadLimits = defaultLimits): Promise<void> {
  const address = `data:text/javascript;base64,${Buffer.from(code, 'utf8').toString('base64')}`
  const thread = new Worker(threadText, {
    eval: true,
    workerData: address,
    stdout: true,
    stderr: true,
    resourceLimits: { maxOldGenerationSizeMb: limits.megabytes },
  })
  const trouble = await ending(thread, limits)
  await thread.terminate()
  if (trouble === undefined) return
  throw refuse('problem-throws', {
    detail: `while it was loaded: ${trouble}.`,
    cure: 'Keep the top level of the problem short: definitions, tables and small set-up. Simulate in simulate().',
  })
}

/** What is wrong, as part of a sentence; undefined when nothing is. */
function ending(thread: Worker, limits: LoadLimits): Promise<string | undefined> {
  return new Promise((resolve) => {
    const timer = setTimeout(
      () => resolve(`it was not done after ${limits.seconds} s`),
      limits.seconds * 1000,
    )
    const settle = (trouble?: string) => {
      clearTimeout(timer)
      resolve(trouble)
    }
    thread.once('message', () => settle())
    thread.once('error', (error: Error & { code?: string }) =>
      settle(
        error.code === 'ERR_WORKER_OUT_OF_MEMORY'
          ? `it needs more than ${limits.megabytes} MB of memory`
          : `it failed outside its own code: ${error.message}`,
      ),
    )
    thread.once('exit', (exitCode: number) =>
      settle(
        exitCode === 0
          ? 'it ended with exit code 0, by process.exit or because a top-level await is never answered'
          : `it ended the process with exit code ${exitCode}`,
      ),
    )
  })
}
