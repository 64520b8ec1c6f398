// The worker agent of `skerry work`, joined: its options from the command line and the environment, Redis, a pool.

import { randomBytes } from 'node:crypto'
import { availableParallelism, homedir, hostname } from 'node:os'
import { defaultPrefix, keyName } from '../../../shared/cluster/keys.js'
import { clusterTimes } from '../../../shared/cluster/times.js'
import { limits } from '../../../shared/limits.js'
import { exitCodes, plainText, refuse } from '../../../shared/refusals.js'
import {
  Agent,
  type AgentOptions,
  cacheFolder,
  fixedLocation,
  memoryMB,
  PluginCache,
  processorClass,
  type QueueLocation,
  readKey,
  recordKey,
  recordLocation,
  secondsLeft,
  serveMetrics,
} from '../../../worker/cluster/index.js'
import { createPool } from '../../../worker/pool.js'
import {
  addressVariable,
  certificateVariable,
  parseAddress,
  RedisAgentQueue,
} from '../../../worker/redis/index.js'
import type { CommandInput, Output } from '../command.js'
import { version } from './version.js'

const keyBytes = 32
/** How long a worker waits for a coordinator that has not started yet, where no --idle-exit says so. */
const waitSeconds = 3600

/** Serves until the agent ends; its exit code. @throws Refusal when it never got to work */
export async function serve(input: CommandInput): Promise<number> {
  const { output } = input
  const lines = new Lines(output)
  const options = agentOptions(input, (sentence) => lines.say(sentence))
  const agent = new Agent(options)
  lines.state = () => agent.condition.state
  lines.say(
    `Worker ${options.agent} on ${options.host}, ${options.cores} cores, ${options.memoryMB} MB, ${options.processor}.`,
  )
  endInTime(output.signal, options.times.leaveMs)
  const port = input.counts['--metrics']
  const close = port === undefined ? undefined : await serveMetrics(port, agent)
  const end = await agent.run().finally(close)
  lines.end(end.sentence, end.exitCode)
  endSoon(end.exitCode)
  return end.exitCode
}

function agentOptions(
  { texts, counts, output }: CommandInput,
  say: (sentence: string) => void,
): AgentOptions {
  const { env } = process
  const times = clusterTimes(Number(env.SKERRY_TEST_TIME_SCALE ?? 1))
  const cores = coresOf(counts['--cores'])
  const host = plainText(texts['--host'] ?? hostname()).slice(0, 200)
  const agent = `${keyName(host)}-${process.pid}-${randomBytes(2).toString('hex')}`
  const folder = cacheFolder(texts['--cache'], homedir(), env.XDG_CACHE_HOME)
  const idleSeconds = counts['--idle-exit']
  const seconds = secondsLeft(texts['--until'], env, Date.now())
  const nowMs = () => performance.now()
  return {
    location: locationOf(texts['--redis'], texts['--record']),
    createQueue: (url) =>
      new RedisAgentQueue({
        address: parseAddress(url, env[certificateVariable]),
        prefix: defaultPrefix,
        agent,
        times,
      }),
    createPool,
    cache: new PluginCache({ folder, key: keyOf(texts['--key'], texts['--record']) }),
    agent,
    host,
    // For tests of clusters with several classes of processors on one machine.
    processor: env.SKERRY_TEST_PROCESSOR ?? processorClass(),
    cores,
    memoryMB: memoryMB(),
    times,
    skerry: version(),
    patienceMs: texts['--record'] === undefined ? times.leaseMs : (idleSeconds ?? waitSeconds) * 1000,
    nowMs,
    say,
    signal: output.signal,
    ...(seconds === undefined ? {} : { untilMs: nowMs() + seconds * 1000 }),
    ...(idleSeconds === undefined ? {} : { idleExitMs: idleSeconds * 1000 }),
  }
}

function coresOf(asked: number | undefined): number {
  const cores = asked ?? availableParallelism()
  if (cores <= limits.threadsMost) return cores
  throw refuse('usage', {
    detail: `--cores ${cores}; expected at most ${limits.threadsMost}, usually the cores of this machine (${availableParallelism()})`,
  })
}

/** Where Redis is: told on the command line, in a record's folder, or in the environment. */
function locationOf(redis: string | undefined, record: string | undefined): QueueLocation {
  if (redis !== undefined && record !== undefined)
    throw refuse('usage', { detail: '--redis and --record; expected one of the two' })
  if (record !== undefined) return recordLocation(record)
  const url = redis ?? process.env[addressVariable]
  if (url === undefined || url === '') {
    throw refuse('usage', {
      detail: `no Redis was named; expected --redis URL, --record DIR, or its address in ${addressVariable}`,
    })
  }
  return fixedLocation(url)
}

/** The key of the site: of a file, or the one that the record's coordinator brought. */
function keyOf(file: string | undefined, record: string | undefined): () => Uint8Array | undefined {
  if (file !== undefined) {
    const key = readKey(file)
    return () => key
  }
  if (record === undefined) return () => undefined
  // While the file cannot be read the last key holds, and before the first one nothing is trusted.
  let key: Uint8Array = Uint8Array.from(randomBytes(keyBytes))
  return () => {
    key = recordKey(record) ?? key
    return key
  }
}

/** Lines for a log: time and sentence, or one JSON object a line. */
class Lines {
  state: () => string = () => 'starting'
  private readonly output: Output

  constructor(output: Output) {
    this.output = output
  }

  say(sentence: string): void {
    this.print({ state: this.state(), text: plainText(sentence) })
  }

  end(sentence: string, exitCode: number): void {
    this.print({ state: 'gone', text: plainText(sentence), exitCode })
  }

  private print({
    text,
    ...more
  }: {
    readonly state: string
    readonly text: string
    readonly exitCode?: number
  }): void {
    const time = new Date().toISOString()
    if (this.output.json) this.output.print(JSON.stringify({ time, ...more, text }))
    else this.output.print(`${time} ${text}`)
  }
}

/** Gone in time after a signal, whatever hangs. */
function endInTime(signal: AbortSignal, leaveMs: number): void {
  const end = () => setTimeout(() => process.exit(exitCodes.interrupted), 0.9 * leaveMs)
  if (signal.aborted) end()
  else signal.addEventListener('abort', end, { once: true })
}

/** A handle that somebody left open does not keep the process: everything is answered and closed. */
function endSoon(exitCode: number): void {
  setTimeout(() => process.exit(exitCode), 200).unref()
}
