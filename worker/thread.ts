// The code inside a simulating thread: loads the pinned bundle once, then batch after batch.
//
// Everything between two messages is synchronous. Before each item the black box notes which one it is, so that the
// pool knows whom to ask when this thread dies or hangs; results leave when a batch is done, at least every 0.4 s of it.

import { parentPort, workerData } from 'node:worker_threads'
import { BrokenPromise, check } from '../shared/check.js'
import { CpuSplit, threadCpuClock, wallSeconds } from './cpu.js'
import { createSimulator, type Simulator } from './simulate.js'
import { Blackbox, captureOutput } from './tail.js'
import {
  type BatchMessage,
  batchLength,
  packDone,
  type SimulatorMessage,
  type SimulatorSettings,
  transferable,
  unpackItem,
} from './wire.js'

export interface ThreadSettings extends SimulatorSettings {
  readonly blackbox: SharedArrayBuffer
}

const flushSeconds = 0.4

const port = parentPort
check(port !== null, 'thread code runs in a thread')
const settings = workerData as ThreadSettings
const box = new Blackbox(settings.blackbox)
const split = new CpuSplit(threadCpuClock())
captureOutput(box)
// A plug-in may leave a promise or a timer behind that throws later; results are made before that and stay good.
process.on('uncaughtException', (error) => console.error('after a simulation:', error))

try {
  const simulator = await createSimulator(settings)
  port.on('message', (message: BatchMessage) => runBatch(message, simulator))
  say({ kind: 'ready' })
} catch (error) {
  say({ kind: 'unusable', reason: error instanceof Error ? error.message : String(error) })
}

function runBatch(message: BatchMessage, simulator: Simulator): void {
  let done: ReturnType<Simulator>[] = []
  let flushed = wallSeconds()
  split.start()
  const length = batchLength(message)
  for (let i = 0; i < length; i++) {
    box.begin(message.batch, i)
    try {
      done.push(simulator(unpackItem(message, i)))
    } catch (error) {
      // evaluate() turns all that a plug-in does wrong into failed rows: this is our own mistake.
      const promise = error instanceof BrokenPromise ? error.message : `evaluate threw: ${String(error)}`
      say({ kind: 'broken', promise })
      return
    }
    if (i === length - 1) box.rest()
    if (i === length - 1 || wallSeconds() - flushed > flushSeconds) {
      const rate = split.rate()
      const priced = done.map((one) => ({ ...one, cpuSeconds: rate * one.wallSeconds }))
      say(packDone(message.batch, i + 1 - done.length, priced))
      done = []
      flushed = wallSeconds()
    }
  }
}

function say(message: SimulatorMessage): void {
  port?.postMessage(message, message.kind === 'done' ? transferable(message) : [])
}
