// The bare queue, to compare with: one process adds a job for every one that has ended, another takes jobs and answers
// with bytes of the usual length. Nothing is decoded, simulated, kept or put in order.

import { type ChildProcess, fork } from 'node:child_process'
import { fileURLToPath } from 'node:url'
import { Queue, QueueEvents, Worker } from 'bullmq'
import { RedisServer } from '../../tools/redis-server.js'
import { answersOf, jobOf } from './payload.js'

/** Jobs out at a time, and jobs a worker has at a time. */
const outstanding = 64
const concurrency = 10
const name = 'bare'

export interface BareOptions {
  readonly jobs: number
  readonly evaluationsEach: number
}
export interface BareRate {
  readonly jobsPerSecond: number
  readonly evaluationsPerSecond: number
  readonly producerCpuMicroseconds: number
  readonly bytesOut: number
  readonly bytesBack: number
}

export async function runBare({ jobs, evaluationsEach }: BareOptions): Promise<BareRate> {
  const server = await RedisServer.start()
  const worker = startWorker({ port: server.port, evaluationsEach })
  const connection = { host: '127.0.0.1', port: server.port }
  const queue = new Queue(name, { connection })
  const events = new QueueEvents(name, { connection })
  await Promise.all([queue.waitUntilReady(), events.waitUntilReady()])
  const data = Buffer.from(jobOf(evaluationsEach)).toString('base64')
  try {
    // The first jobs compile the code of both sides.
    await loop(queue, events, data, Math.ceil(jobs / 5))
    const own = process.cpuUsage()
    const startMs = performance.now()
    await loop(queue, events, data, jobs)
    const seconds = (performance.now() - startMs) / 1000
    const { user, system } = process.cpuUsage(own)
    return {
      jobsPerSecond: jobs / seconds,
      evaluationsPerSecond: (jobs * evaluationsEach) / seconds,
      producerCpuMicroseconds: (user + system) / (jobs * evaluationsEach),
      bytesOut: data.length,
      bytesBack: answersOf(evaluationsEach).length,
    }
  } finally {
    await Promise.all([queue.close(), events.close()])
    worker.kill('SIGKILL')
    await server.close()
  }
}

let numbers = 0

async function loop(queue: Queue, events: QueueEvents, data: string, jobs: number): Promise<void> {
  let ended = 0
  let added = 0
  const add = (count: number) => {
    const list = Array.from({ length: Math.min(count, jobs - added) }, () => ({
      name,
      data: { data },
      opts: { jobId: `j${numbers++}`, removeOnComplete: true, removeOnFail: true },
    }))
    added += list.length
    return list.length === 0 ? undefined : queue.addBulk(list)
  }
  await new Promise<void>((resolve, reject) => {
    let due = 0
    const onCompleted = () => {
      ended++
      due++
      if (ended === jobs) {
        events.off('completed', onCompleted)
        resolve()
        return
      }
      // As many as have come in together go out together.
      if (due > 1) return
      setImmediate(() => {
        const count = due
        due = 0
        add(count)?.catch(reject)
      })
    }
    events.on('completed', onCompleted)
    add(outstanding)?.catch(reject)
  })
}

function startWorker(options: BareWorkerOptions): ChildProcess {
  const child = fork(fileURLToPath(new URL('../main.js', import.meta.url)), ['--task', 'bareWorker'])
  child.send(options)
  return child
}

export interface BareWorkerOptions {
  readonly port: number
  readonly evaluationsEach: number
}

/** Works until it is killed. */
export async function serveBare({ port, evaluationsEach }: BareWorkerOptions): Promise<never> {
  const back = Buffer.from(answersOf(evaluationsEach)).toString('base64')
  const worker = new Worker(name, async () => back, { connection: { host: '127.0.0.1', port }, concurrency })
  worker.on('error', () => {})
  await worker.waitUntilReady()
  return new Promise(() => {})
}
