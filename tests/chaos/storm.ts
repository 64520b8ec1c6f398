// A seeded storm over a real cluster: a coordinator, eight workers, a Redis and a proxy between workers and Redis, all
// processes of their own. A supervisor starts again what ended, as systemd or a batch system would; the storm kills,
// stops, empties, cuts and garbles, one fault after the other, in an order that follows from the seed.

import { copyFileSync, existsSync, rmSync } from 'node:fs'
import { join } from 'node:path'
import { clusterTimes } from '../../shared/cluster/times.js'
import { type Stream, stream } from '../../shared/streams.js'
import { descendants } from '../queue/agent-site.js'
import { pause, type RedisServer } from '../tools/redis-server.js'
import { type Bench, type Ending, type Life, reportOf } from './programs.js'
import type { BadLine } from './proxy.js'

export const workers = 8
const hosts = 5
const record = 'records/storm'

/** What ends a coordinator or a worker and is mended by starting it again: told to leave with nothing in hand, no Redis,
 * told to leave in the middle. */
const startAgain = new Set([0, 69, 75])

/** Undelivered answers: three times each, in another order. */
const shuffleAnswers = `
local key = KEYS[1]
local groups = redis.call('XINFO', 'GROUPS', key)
local last = '0-0'
for _, group in ipairs(groups) do
  for i = 1, #group, 2 do if group[i] == 'last-delivered-id' then last = group[i + 1] end end
end
local entries = redis.call('XRANGE', key, '(' .. last, '+')
for _, entry in ipairs(entries) do redis.call('XDEL', key, entry[1]) end
for copy = 1, 3 do
  for i = #entries, 1, -1 do redis.call('XADD', key, '*', unpack(entries[i][2])) end
end
return #entries`

/** Undelivered answers vanish. */
const loseAnswers = shuffleAnswers.replace('for copy = 1, 3', 'for copy = 1, 0')

export class Storm {
  readonly bench: Bench
  readonly server: RedisServer
  readonly proxy: BadLine
  readonly draw: Stream
  readonly times
  /** Faults in order, for a failing seed. */
  readonly log: string[] = []
  killed = 0
  /** Answers that were doubled and turned round. */
  shuffled = 0
  private readonly slots: (Life | undefined)[] = []
  private coordinator: Life | undefined
  private readonly coordinators: Life[] = []
  private over: Ending | undefined
  private failure: Error | undefined
  private hasOldData = false
  private readonly loose: Promise<void>[] = []

  constructor(bench: Bench, server: RedisServer, proxy: BadLine, seed: number, scale: number) {
    this.bench = bench
    this.server = server
    this.proxy = proxy
    this.draw = stream(seed, 'weather', 30)
    this.times = clusterTimes(scale)
  }

  begin(): void {
    this.startCoordinator()
    for (let slot = 0; slot < workers; slot++) this.startWorker(slot)
  }

  /** True as long as there is a search to disturb. @throws what a process of ours ended with, unless it may */
  get isOn(): boolean {
    if (this.failure) throw this.failure
    return this.over === undefined
  }

  async fault(name: keyof typeof faults): Promise<void> {
    this.log.push(`${name} at ${this.bench.committed(record)}`)
    if (this.draw.chance(1, 3) || !this.hasOldData) this.keepOldData()
    await faults[name](this)
  }

  /** Resolves with what the coordinator said when the search was finished. */
  async finished(seconds: number): Promise<ReturnType<typeof reportOf>> {
    const endMs = performance.now() + seconds * 1000
    while (this.isOn) {
      if (performance.now() > endMs) throw new Error(`not finished in ${seconds} s\n${this.told()}`)
      await pause(50)
    }
    await Promise.all(this.loose)
    return reportOf(this.over!.out)
  }

  /** What coordinators said, for a person who looks into a failure. */
  told(): string {
    const faultsSoFar = this.log.join('\n  ')
    const said = this.coordinators.map((life) => life.err).join('\n-- next coordinator\n')
    return `faults:\n  ${faultsSoFar}\ncoordinators said:\n${said}`
  }

  // ------------------------------------------------------------------------------- what faults use

  anyWorker(): Life | undefined {
    const alive = this.slots.filter((life) => life !== undefined && !life.isOver)
    return alive.length === 0 ? undefined : alive[this.draw.below(alive.length)]
  }

  killWorker(): void {
    const life = this.anyWorker()
    if (!life) return
    life.kill('SIGKILL')
    this.killed++
  }

  /** Stops the agent, or all processes of the machine, past the lease. */
  stopWorker(): void {
    const life = this.anyWorker()
    if (!life) return
    const pids = this.draw.chance(1, 2) ? [life.pid] : [life.pid, ...descendants(life.pid)]
    for (const pid of pids) signal(pid, 'SIGSTOP')
    this.later(1.5 * this.times.leaseMs, () => {
      for (const pid of pids) signal(pid, 'SIGCONT')
    })
  }

  killCoordinator(): void {
    this.coordinator?.kill('SIGKILL')
  }

  async stopCoordinator(ms: number, meanwhile?: () => Promise<void>): Promise<void> {
    const life = this.coordinator
    life?.kill('SIGSTOP')
    await pause(ms)
    await meanwhile?.()
    life?.kill('SIGCONT')
  }

  async restartRedis(data: 'empty' | 'old'): Promise<void> {
    await this.server.kill()
    const file = join(this.server.folder, 'dump.rdb')
    rmSync(file, { force: true })
    if (data === 'old') copyFileSync(this.oldFile, file)
    await pause(this.times.heartbeatMs * this.draw.uniform())
    await this.server.start()
    rmSync(file, { force: true })
  }

  /** Gives how many answers it found. */
  answers(script: string): number {
    return Number(this.server.ask('EVAL', script, '1', 'skerry:s:weir:results').replace(/\D/g, '') || 0)
  }

  later(ms: number, act: () => void): void {
    this.loose.push(pause(ms).then(act))
  }

  // ----------------------------------------------------------------------------------- supervision

  private get oldFile(): string {
    return join(this.server.folder, 'old.rdb')
  }

  private keepOldData(): void {
    this.server.ask('SAVE')
    const file = join(this.server.folder, 'dump.rdb')
    if (!existsSync(file)) return
    copyFileSync(file, this.oldFile)
    rmSync(file)
    this.hasOldData = true
  }

  private startCoordinator(): void {
    const life = this.bench.run(record, ['--redis', this.server.url])
    this.coordinator = life
    this.coordinators.push(life)
    void life.ended.then((end) => {
      if (end.code === 0) this.over = end
      else this.again('coordinator', end, () => this.startCoordinator())
    })
  }

  private startWorker(slot: number): void {
    const life = this.bench.work(this.proxy.url, `machine-${slot % hosts}`)
    this.slots[slot] = life
    void life.ended.then((end) => this.again('worker', end, () => this.startWorker(slot)))
  }

  private again(what: string, end: Ending, start: () => void): void {
    if (this.over || this.failure) return
    // By the signal itself: killed, or told to leave before it had come to listen.
    const bySignal = end.signal === 'SIGKILL' || end.signal === 'SIGTERM'
    const mayEnd = bySignal || startAgain.has(end.code ?? -1)
    if (mayEnd) setTimeout(() => !this.over && start(), 200)
    else this.failure = new Error(`a ${what} ended with ${end.code ?? end.signal}:\n${end.out}\n${end.err}`)
  }
}

export const faults = {
  'kill -9 a worker': async (storm) => storm.killWorker(),
  'stop a worker past its lease': async (storm) => storm.stopWorker(),
  'take a worker away by SIGTERM': async (storm) => storm.anyWorker()?.kill('SIGTERM'),
  'kill -9 the coordinator': async (storm) => storm.killCoordinator(),
  'stop the coordinator': (storm) => storm.stopCoordinator(2 * storm.times.silentMs),
  'double and turn round answers': async (storm) => {
    await storm.stopCoordinator(storm.times.silentMs / 2, async () => {
      for (let tries = 0; tries < 20 && storm.shuffled === 0; tries++) {
        storm.shuffled += storm.answers(shuffleAnswers)
        await pause(100)
      }
    })
  },
  'lose answers': (storm) =>
    storm.stopCoordinator(storm.times.silentMs / 2, async () => {
      storm.answers(loseAnswers)
    }),
  'restart Redis empty': (storm) => storm.restartRedis('empty'),
  'restart Redis with old data': (storm) => storm.restartRedis('old'),
  'freeze Redis': async (storm) => {
    storm.server.signal('SIGSTOP')
    await pause(2000)
    storm.server.signal('SIGCONT')
  },
  'empty Redis': async (storm) => {
    storm.server.ask('FLUSHALL')
  },
  'delay the network': async (storm) => storm.proxy.trouble('delay', 1500),
  'cut connections': async (storm) => storm.proxy.trouble('cut', 0),
  'lose what workers say': async (storm) => storm.proxy.trouble('half-open up', 2 * storm.times.leaseMs),
  'lose what workers hear': async (storm) => storm.proxy.trouble('half-open down', 2 * storm.times.leaseMs),
  'slow the network to a trickle': async (storm) => storm.proxy.trouble('trickle', 1500),
} as const satisfies { readonly [name: string]: (storm: Storm) => Promise<void> | Promise<unknown> }

function signal(pid: number, name: NodeJS.Signals): void {
  try {
    process.kill(pid, name)
  } catch {
    // Gone meanwhile.
  }
}
