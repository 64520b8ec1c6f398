// The code of a simulating child process: one item at a time, each answered before the next is asked for. It lives
// for items that killed threads or whose agent died among others: here it is known who did it.
//
// No orphans: when the channel to the parent closes the process ends, and a small watching thread ends it when the
// parent is gone although the simulation never returns to its event loop.

import { Worker } from 'node:worker_threads'
import { BrokenPromise } from '../shared/check.js'
import { processCpuSeconds } from './cpu.js'
import { leaveWithFolder } from './leave.js'
import { createSimulator, type Simulator } from './simulate.js'
import {
  type BatchMessage,
  packDone,
  type SimulatorMessage,
  type SimulatorSettings,
  unpackItem,
} from './wire.js'

/** What the parent says: settings once, then items, each a batch of one. */
export type ChildOrder = { readonly settings: SimulatorSettings } | { readonly item: BatchMessage }

const watchSeconds = 0.5
let simulator: Simulator | undefined

watchParent()
process.on('disconnect', leaveWithFolder)
process.on('uncaughtException', (error) => console.error('after a simulation:', error))
process.on('message', (order: ChildOrder) => {
  if ('settings' in order) void load(order.settings)
  else run(order.item)
})

async function load(settings: SimulatorSettings): Promise<void> {
  try {
    simulator = await createSimulator(settings)
    say({ kind: 'ready' })
  } catch (error) {
    say({ kind: 'unusable', reason: error instanceof Error ? error.message : String(error) })
  }
}

function run(message: BatchMessage): void {
  try {
    if (simulator === undefined) throw new BrokenPromise('items come after the bundle has been loaded')
    const start = processCpuSeconds()
    const simulated = simulator(unpackItem(message, 0))
    say(packDone(message.batch, 0, [{ ...simulated, cpuSeconds: processCpuSeconds() - start }]))
  } catch (error) {
    say({ kind: 'broken', promise: error instanceof Error ? error.message : String(error) })
  }
}

function say(message: SimulatorMessage): void {
  if (process.connected) process.send?.(message)
}

function watchParent(): void {
  const code = `
    const parent = process.ppid
    setInterval(() => {
      if (process.ppid === parent) return
      try { require('node:fs').rmdirSync(process.cwd()) } catch {}
      process.kill(process.pid, 'SIGKILL')
    }, ${watchSeconds * 1000})
  `
  new Worker(code, { eval: true, resourceLimits: { maxOldGenerationSizeMb: 16 } }).unref()
}
