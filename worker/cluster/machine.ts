// What there is to know about this machine: its class of processor, its memory, when it will be taken away.

import { readFileSync } from 'node:fs'
import { cpus, totalmem } from 'node:os'
import { refuse } from '../../shared/refusals.js'

/**
 * Class of this machine's processor. Within one class honest machines agree to the last bit of what the host's own
 * mathematics gives: vendor, family and model on x64 ('x64 AuthenticAMD 25/1'), implementer and part on arm64.
 */
export function processorClass(arch: string = process.arch, cpuinfo = readText('/proc/cpuinfo')): string {
  const field = (name: string) => new RegExp(`^${name}\\s*:\\s*(.+)$`, 'm').exec(cpuinfo)?.[1]?.trim()
  const vendor = field('vendor_id')
  if (vendor !== undefined) return `${arch} ${vendor} ${field('cpu family') ?? '?'}/${field('model') ?? '?'}`
  const implementer = field('CPU implementer')
  if (implementer !== undefined) return `${arch} ${implementer} ${field('CPU part') ?? '?'}`
  return `${arch} ${cpus()[0]?.model ?? 'unknown'}`.slice(0, 200)
}

/** Megabytes that simulations may hold together: what the system, its container or the batch system allows. */
export function memoryMB(env: NodeJS.ProcessEnv = process.env): number {
  const bounds = [totalmem() / 2 ** 20]
  const constrained = process.constrainedMemory()
  if (constrained !== undefined && constrained > 0) bounds.push(constrained / 2 ** 20)
  const node = Number(env.SLURM_MEM_PER_NODE)
  if (node > 0) bounds.push(node)
  const perCore = Number(env.SLURM_MEM_PER_CPU) * Number(env.SLURM_CPUS_ON_NODE ?? env.SLURM_CPUS_PER_TASK)
  if (perCore > 0) bounds.push(perCore)
  return Math.floor(Math.min(...bounds))
}

/**
 * Seconds until this machine is taken away: `asked` (a date and time, or seconds since 1970), else what the batch system
 * says; undefined when nobody says. The wall clock is read once: later jumps of it change nothing.
 */
export function secondsLeft(
  asked: string | undefined,
  env: NodeJS.ProcessEnv,
  nowWallMs: number,
): number | undefined {
  if (asked === undefined) {
    const end = Number(env.SLURM_JOB_END_TIME)
    return end > 0 ? end - nowWallMs / 1000 : undefined
  }
  const ms = /^\d{9,11}$/.test(asked) ? Number(asked) * 1000 : Date.parse(asked)
  const example = new Date(nowWallMs + 3_600_000).toISOString()
  if (!Number.isFinite(ms)) {
    throw refuse('usage', { detail: `--until ${asked} is no time; expected one like ${example}` })
  }
  if (ms <= nowWallMs) throw refuse('usage', { detail: `--until ${asked} is over` })
  return (ms - nowWallMs) / 1000
}

function readText(file: string): string {
  try {
    return readFileSync(file, 'latin1')
  } catch {
    return ''
  }
}
