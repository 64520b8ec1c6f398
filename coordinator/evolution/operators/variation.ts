// Variation of whole genomes: founders, children, mutants and distances, part by part with the operators that the
// plan names, in the order of the specification. Everything new passes the problem's repair.

import { check } from '../../../shared/check.js'
import { randomGenome } from '../../../shared/encodings.js'
import type { Genome, GenomeSpec, PartValue } from '../../../shared/genome.js'
import type { OperatorPlan } from '../plan.js'
import type { Variation } from '../types.js'
import { distanceOf } from './distance.js'
import type { Crossover, Mutation } from './rows.js'
import { crossoverRows, mutationRows, rowOf } from './tables.js'

export interface VariationOptions {
  /** Makes a genome buildable; pure, idempotent, and it never changes its argument. Default: as it is. */
  readonly repair?: (genome: Genome) => Genome
}

interface Part {
  readonly name: string
  readonly cross: Crossover
  readonly mutate: Mutation
  readonly distance: (a: PartValue, b: PartValue) => number
}

/** The variation of genomes of `spec`; `operators` has a checked plan for every part. */
export function makeVariation(
  spec: GenomeSpec,
  operators: { readonly [part: string]: OperatorPlan },
  options: VariationOptions = {},
): Variation {
  const parts = Object.keys(spec).map((name) => partOf(name, spec, operators))
  const repair = options.repair ?? ((genome: Genome) => genome)
  return {
    founder: (stream) => repair(randomGenome(spec, stream)),
    cross: (a, b, stream) => {
      const child: Record<string, PartValue> = {}
      for (const part of parts) child[part.name] = part.cross(a[part.name]!, b[part.name]!, stream)
      return repair(child)
    },
    mutate: (genome, stream) => {
      const mutant: Record<string, PartValue> = {}
      for (const part of parts) mutant[part.name] = part.mutate(genome[part.name]!, stream)
      return repair(mutant)
    },
    distance: (a, b) => {
      let sum = 0
      for (const part of parts) sum += part.distance(a[part.name]!, b[part.name]!)
      return parts.length === 0 ? 0 : sum / parts.length
    },
  }
}

function partOf(name: string, spec: GenomeSpec, operators: { readonly [part: string]: OperatorPlan }): Part {
  const encoding = spec[name]!
  const plan = operators[name]
  check(plan !== undefined, `part '${name}' has a plan of operators`)
  const crossover = rowOf(crossoverRows, plan.crossover.operator)
  const mutation = rowOf(mutationRows, plan.mutation.operator)
  check(
    crossover.encodings.includes(encoding.kind),
    `crossover '${crossover.name}' fits ${encoding.kind} parts`,
  )
  check(mutation.encodings.includes(encoding.kind), `mutation '${mutation.name}' fits ${encoding.kind} parts`)
  return {
    name,
    cross: crossover.build(encoding, plan.crossover.settings),
    mutate: mutation.build(encoding, plan.mutation.settings),
    distance: distanceOf(encoding),
  }
}
