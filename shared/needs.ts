// What one simulation asks of the machine that runs it, and of the site: cores, memory, licences. The same words and
// the same packing for a machine that works by itself, for the workers of a cluster and for what `check` says.

import { limits } from './limits.js'

export interface Needs {
  /** Cores that it keeps busy, from 1. */
  readonly cores: number
  /** Megabytes that it may hold; what holds more is ended. */
  readonly memoryMB: number
  /** Licences: how many of each the simulation holds while it runs. The search file says how many the site has. */
  readonly tokens: { readonly [name: string]: number }
}
/** As an author says it: what is left out is as usual. */
export type NeedsInput = Partial<Needs>

/** Of a problem that says nothing. */
export const usualNeeds: Needs = { cores: 1, memoryMB: limits.megabytesUsual, tokens: {} }

export function needsOf(given: NeedsInput | undefined): Needs {
  return { ...usualNeeds, ...given }
}

/** Simulations at once where there is so much of each; 0 when there is not even enough for one. */
export function placesFor({ cores, memoryMB, tokens }: Needs, there: Needs): number {
  const licences = Object.entries(tokens).map(([name, count]) =>
    Math.floor((there.tokens[name] ?? 0) / count),
  )
  return Math.min(Math.floor(there.cores / cores), Math.floor(there.memoryMB / memoryMB), ...licences)
}

/** For a person: '2 cores, 4,096 MB and 1 of licence flow-solver'. */
export function needsWords({ cores, memoryMB, tokens }: Needs): string {
  const machine = `${cores} ${cores === 1 ? 'core' : 'cores'}`
  const memory = `${String(memoryMB).replace(/\B(?=(\d{3})+$)/g, ',')} MB`
  const licences = Object.entries(tokens).map(([name, count]) => `${count} of licence ${name}`)
  const words = [machine, memory, ...licences]
  return `${words.slice(0, -1).join(', ')} and ${words.at(-1)}`
}
