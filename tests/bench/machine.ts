// The machine a figure was measured on, and whether it had time for it.

import { readFileSync } from 'node:fs'
import { cpus, loadavg, release, type as systemName, totalmem } from 'node:os'
import { cpuSecondsOfFamily } from './processes.js'

export interface Machine {
  readonly cpu: string
  readonly cores: number
  readonly memoryGigabytes: number
  readonly system: string
  readonly node: string
}

export function describeMachine(): Machine {
  const processors = cpus()
  return {
    cpu: processors[0]?.model.trim() ?? 'unknown',
    cores: processors.length,
    memoryGigabytes: Number((totalmem() / 2 ** 30).toFixed(1)),
    system: `${systemName()} ${release()}`,
    node: process.version,
  }
}

/** How busy the machine was with other things while something was measured. */
export interface Company {
  readonly loadBefore: number
  readonly loadAfter: number
  /** Cores that others used, on average, time that the host took away included. */
  readonly coresOfOthers: number
  readonly tooBusy: boolean
}

/** Part of the machine that others may use before a figure that depends on time is not to be trusted. */
const othersMost = 0.1

/** Starts watching; the function returned ends it. */
export function watchCompany(): () => Company {
  const loadBefore = loadavg()[0]!
  const busy = busySeconds()
  const own = cpuSecondsOfFamily()
  const startMs = performance.now()
  return () => {
    const seconds = (performance.now() - startMs) / 1000
    const others = busySeconds() - busy - (cpuSecondsOfFamily() - own)
    const coresOfOthers = Math.max(0, others / seconds)
    return {
      loadBefore,
      loadAfter: loadavg()[0]!,
      coresOfOthers: Number(coresOfOthers.toFixed(2)),
      tooBusy: coresOfOthers > othersMost * cpus().length,
    }
  }
}

/** CPU seconds of all processors since the machine started, idle and waiting time left out (Linux). */
function busySeconds(): number {
  const line = /^cpu +(.*)$/m.exec(readFileSync('/proc/stat', 'utf8'))?.[1] ?? ''
  const [user = 0, nice = 0, system = 0, , , interrupts = 0, soft = 0, stolen = 0] = line
    .split(' ')
    .map(Number)
  return (user + nice + system + interrupts + soft + stolen) / 100
}
