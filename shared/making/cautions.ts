// Which cautions leave with a machine: the rows of the hazard table that its problem's declarations call for, with
// the machine's own numbers, then what the problem adds itself. They leave with every picture, replay and summary.
//
// Never throws for what a plug-in does: a search of weeks must not end without its cautions. A declaration that
// cannot be read counts as none, and that is said.

import type { Genome } from '../genome.js'
import type { AnyProblem, Caution } from '../problem.js'
import type { Declared, DeclaredField } from './conditions.js'
import { useFault } from './declare.js'
import { type HazardRow, hazards } from './hazards.js'
import { noMachine, type Use } from './types.js'

/** Stands under every machine, whatever is declared. */
export const alwaysCaution =
  'A simulation is no certificate. A machine found by a search works at the edge of its model: run it first at reduced amplitude, behind a guard and with nobody in reach, and follow local codes, the data sheets of the makers and licensed practice.'

type Declaring = Pick<AnyProblem, 'use' | 'process' | 'parts' | 'cautions'>

/** What a person calls the declared fields. */
export const fieldWords: { readonly [field in DeclaredField]: string } = {
  places: 'places of use',
  wetted: 'what water it touches',
  energy: 'sources of energy',
  gasPressurePa: 'pressure of gas',
  gasVolumeM3: 'volume of gas',
  liquidPressurePa: 'pressure of liquid',
  storedElasticJ: 'stored spring energy',
  suspendedKg: 'suspended mass',
  suspendedHeightM: 'height of what is suspended',
  movingParts: 'moving parts',
  peakForceN: 'peak force',
  rotationHz: 'speed of rotation',
  voltageV: 'voltage',
  battery: 'kind of battery',
  hottestC: 'hottest surface',
  massKg: 'mass',
  onRunningMachine: 'whether it sits on a running machine',
  vibrationHz: 'frequency of vibration',
  upstreamOfPump: 'whether a pump is downstream',
  methods: 'how it is made',
}

/** The rows that are shown for these declarations, in the order of the table. */
export function hazardsOf(declared: Declared): readonly HazardRow[] {
  return hazards.filter((row) => row.when.holds(declared) !== 'no')
}

/** One row as a caution, with the machine's numbers, or with what is not declared. */
export function cautionOf(row: HazardRow, declared: Declared): Caution {
  const { hazard, consult, why } = row
  if (row.when.holds(declared) === 'unknown') {
    const unknown = row.when.fields.filter((field) => declared[field] === undefined)
    return {
      hazard,
      because: `${why} (not declared: ${unknown.map((field) => fieldWords[field]).join(', ')})`,
      consult,
    }
  }
  const numbers = row.numbers?.(declared)
  return { hazard, because: numbers === undefined ? why : `${numbers}; ${why}`, consult }
}

/** All cautions of a machine: those that its problem's declarations call for, then the problem's own. */
export function cautionsOf(problem: Declaring, genome: Genome): readonly Caution[] {
  const own = ownCautions(problem, genome)
  if (problem.use === noMachine) return own
  const { use, trouble } = useOf(problem, genome)
  const declared = declaredOf(problem, genome, use)
  const derived = hazardsOf(declared).map((row) => cautionOf(row, declared))
  return [...(trouble === undefined ? [] : [trouble]), ...derived, ...own]
}

/** What the problem leaves open, in words, as far as a hazard asks for it. */
export function undeclaredOf(problem: Declaring, genome: Genome): readonly string[] {
  if (problem.use === noMachine) return []
  const declared = declaredOf(problem, genome, useOf(problem, genome).use)
  const asked = new Set(
    hazardsOf(declared)
      .filter((row) => row.when.holds(declared) === 'unknown')
      .flatMap((row) => row.when.fields),
  )
  return [...asked].filter((field) => declared[field] === undefined).map((field) => fieldWords[field])
}

function ownCautions({ cautions }: Declaring, genome: Genome): readonly Caution[] {
  try {
    return cautions?.(genome as never) ?? []
  } catch (error) {
    return [unreadable(`its own cautions could not be listed: ${textOf(error)}`)]
  }
}

function useOf({ use }: Declaring, genome: Genome): { readonly use: Use; readonly trouble?: Caution } {
  if (use === undefined) {
    return {
      use: {},
      trouble: unreadable('the problem declares no use, so every hazard of the table is listed'),
    }
  }
  try {
    const given: unknown = typeof use === 'function' ? use(genome as never) : use
    const fault = useFault(given)
    if (fault === undefined) return { use: given as Use }
    return {
      use: {},
      trouble: unreadable(`its use cannot be read, so every hazard of the table is listed: ${fault}`),
    }
  } catch (error) {
    const why = `its use cannot be read, so every hazard of the table is listed: ${textOf(error)}`
    return { use: {}, trouble: unreadable(why) }
  }
}

function unreadable(because: string): Caution {
  return {
    hazard: 'Use not declared',
    because,
    consult: 'the author of the problem, and a person licensed for such machines',
  }
}

/** A text without the full stop that the sentence around it brings. */
function textOf(error: unknown): string {
  return (error instanceof Error ? error.message : 'an error without a text').replace(/\.$/, '')
}

/** The use with how the machine is made, and with the mass of the listed parts where the use does not say it. */
export function declaredOf(problem: Declaring, genome: Genome, use: Use): Declared {
  const { parts } = problem
  const methods = problem.process === undefined ? {} : { methods: problem.process.methods }
  if (use.massKg !== undefined || parts === undefined) return { ...use, ...methods }
  try {
    const { massKg } = parts(genome as never)
    return typeof massKg === 'number' ? { ...use, massKg, ...methods } : { ...use, ...methods }
  } catch {
    return { ...use, ...methods }
  }
}
