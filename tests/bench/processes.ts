// What the kernel says about processes (Linux): CPU of a family, alive and gone.

import { readdirSync, readFileSync } from 'node:fs'

/** The kernel counts CPU in hundredths of a second. */
const ticksPerSecond = 100

interface Usage {
  readonly ownSeconds: number
  /** Of children that have ended and were waited for, and of theirs. */
  readonly endedSeconds: number
}

/** CPU seconds of this process and of everything that it started, whether it still runs or not. */
export function cpuSecondsOfFamily(): number {
  const { user, system } = process.cpuUsage()
  return (user + system) / 1e6 + (usageOf('self')?.endedSeconds ?? 0) + runningSeconds('self')
}

/** CPU seconds of children that have ended, and of theirs. */
export function cpuSecondsOfEnded(): number {
  return usageOf('self')?.endedSeconds ?? 0
}

/** CPU seconds of one process, without its children. */
export function cpuSecondsOf(pid: number): number {
  return usageOf(String(pid))?.ownSeconds ?? 0
}

function runningSeconds(parent: string): number {
  return childrenOf(parent).reduce((sum, pid) => {
    const usage = usageOf(pid)
    return usage ? sum + usage.ownSeconds + usage.endedSeconds + runningSeconds(pid) : sum
  }, 0)
}

function childrenOf(pid: string): string[] {
  try {
    return readdirSync(`/proc/${pid}/task`).flatMap((thread) =>
      readFileSync(`/proc/${pid}/task/${thread}/children`, 'utf8').split(' ').filter(Boolean),
    )
  } catch {
    return [] // It has ended meanwhile.
  }
}

function usageOf(pid: string): Usage | undefined {
  try {
    const stat = readFileSync(`/proc/${pid}/stat`, 'utf8')
    // After the name, which ends with the last parenthesis: state is field 3; user and system time are fields 14
    // and 15, those of ended children 16 and 17.
    const fields = stat.slice(stat.lastIndexOf(')') + 2).split(' ')
    const seconds = (field: number) =>
      (Number(fields[field - 3]) + Number(fields[field - 2])) / ticksPerSecond
    return { ownSeconds: seconds(14), endedSeconds: seconds(16) }
  } catch {
    return undefined
  }
}
