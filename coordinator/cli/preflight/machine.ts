// This machine: versions and limits that a coordinator or a worker runs into after days, not at the start.

import { readFileSync } from 'node:fs'
import { availableParallelism, freemem } from 'node:os'
import { bad, doubtful, good, type Line } from './line.js'

export interface MachineFacts {
  readonly nodeVersion: string
  readonly cores: number
  readonly freeBytes: number
  /** Open files a process may have; undefined where the system does not tell. */
  readonly openFiles: number | undefined
  readonly processes: number | undefined
  readonly nowMs: number
}

/** Node that everything was tested with, at least. */
const oldestNode: readonly [number, number] = [20, 19]
const openFilesLeast = 1024
const processesLeast = 256
const freeBytesLeast = 2 ** 29
/** No clock of a machine that works is before the day this was written. */
const firstPossibleMs = Date.UTC(2026, 0, 1)
const lastPossibleMs = Date.UTC(2100, 0, 1)

export function machineFacts(): MachineFacts {
  return {
    nodeVersion: process.versions.node,
    cores: availableParallelism(),
    freeBytes: freemem(),
    openFiles: limitOf('Max open files'),
    processes: limitOf('Max processes'),
    nowMs: Date.now(),
  }
}

export function judgeMachine(facts: MachineFacts): Line[] {
  return [
    node(facts.nodeVersion),
    good('cores', `${facts.cores}; --cores uses fewer`),
    memory(facts.freeBytes),
    atLeast('open files', facts.openFiles, openFilesLeast, 'ulimit -n 4096, or LimitNOFILE= in the unit'),
    atLeast('processes', facts.processes, processesLeast, 'ulimit -u 4096, or ask who runs the machine'),
    clock(facts.nowMs),
  ]
}

function node(version: string): Line {
  const [major = 0, minor = 0] = version.split('.').map(Number)
  const [needMajor, needMinor] = oldestNode
  const found = `${version}; needed ${oldestNode.join('.')} or newer`
  return major > needMajor || (major === needMajor && minor >= needMinor)
    ? good('Node', found)
    : bad('Node', found, 'install a newer Node')
}

function memory(bytes: number): Line {
  const found = `${(bytes / 2 ** 30).toFixed(1)} GB free`
  return bytes >= freeBytesLeast
    ? good('memory', found)
    : doubtful('memory', found, 'free some, or use fewer cores: each simulation may hold up to 1 GB')
}

function atLeast(what: string, found: number | undefined, least: number, cure: string): Line {
  if (found === undefined)
    return doubtful(what, 'this system does not tell its limit', `make sure of ${least}`)
  const text = Number.isFinite(found) ? `at most ${found}` : 'no limit'
  return found >= least ? good(what, text) : bad(what, `${text}; needed ${least}`, cure)
}

function clock(nowMs: number): Line {
  const found = new Date(nowMs).toISOString().slice(0, 16).replace('T', ' ')
  return nowMs >= firstPossibleMs && nowMs < lastPossibleMs
    ? good('clock', `${found} UTC`)
    : bad('clock', `${found} UTC cannot be right`, 'set the clock (chronyd, systemd-timesyncd)')
}

/** The soft limit of that name of this process, from proc(5). */
function limitOf(name: string): number | undefined {
  try {
    const line = readFileSync('/proc/self/limits', 'utf8')
      .split('\n')
      .find((text) => text.startsWith(name))
    const soft = line?.slice(name.length).trim().split(/\s+/)[0]
    if (soft === undefined) return undefined
    return soft === 'unlimited' ? Number.POSITIVE_INFINITY : Number(soft)
  } catch {
    return undefined
  }
}
