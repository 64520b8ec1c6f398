// The worker agent of `skerry work`, joined: its options from the command line and the environment, Redis, a pool.

import { randomBytes } from 'node:crypto'
import { availableParallelism, homedir, hostname } from 'node:os'
import { defaultPrefix, keyName } from '../../../shared/cluster/keys.js'
import { clusterTimes } from '../../../shared/cluster/times.js'
import { limits } from '../../../shared/limits.js'
import { exitCodes, plainText, refuse } from '../../../shared/refusals.js'
import { createPool } from '../../../worker/pool.js'
import {
  addressVariable,
  certificateVariable,
  parseAddress,
  RedisAgentQueue,
} from '../../../worker/redis/index.js'
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
  secondsLeft,
} from '../../../worker/work/index.js'
import type { CommandInput, Output } from '../command.js'
import { version } from './version.js'

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
  const end = await agent.run()
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
  const key = texts['--key']
  const folder = cacheFolder(texts['--cache'], homedir(), env.XDG_CACHE_HOME)
  const idleSeconds = counts['--idle-exit']
  const seconds = secondsLeft(texts['--until'], env, Date.now())
  const nowMs = () => performance.now()
  return {
    location: locationOf(texts['--redis']),
    createQueue: (url) =>
      new RedisAgentQueue({
        address: parseAddress(url, env[certificateVariable]),
        prefix: defaultPrefix,
        agent,
        times,
      }),
    createPool,
    cache: new PluginCache({ folder, ...(key === undefined ? {} : { key: readKey(key) }) }),
    agent,
    host,
    // For tests of clusters with several classes of processors on one machine.
    processor: env.SKERRY_TEST_PROCESSOR ?? processorClass(),
    cores,
    memoryMB: memoryMB(),
    times,
    skerry: version(),
    patienceMs: times.leaseMs,
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

/** Where Redis is: told on the command line or in the environment. */
function locationOf(redis: string | undefined): QueueLocation {
  const url = redis ?? process.env[addressVariable]
  if (url === undefined || url === '') {
    throw refuse('usage', {
      detail: `no Redis was named; expected --redis URL, or its address in ${addressVariable}`,
    })
  }
  return fixedLocation(url)
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
