// Diversity: how different the members of a population still are, part by part, and quantiles of their scores.
// Statistics only: nothing here enters a decision of the search.
//
// The mean pairwise distance of a part is the mean over its genes, and for one gene it follows from the sorted
// values (or from the counts of the options), so it is computed for all pairs without visiting them.

import { check } from '../../shared/check.js'
import type { Encoding, Genome, GenomeSpec, PartValue } from '../../shared/genome.js'
import { scaledGene } from './operators/distance.js'

/** Above this many members, evenly spaced ones of their order are taken: the answer hardly moves, the cost stops. */
export const diversityMembersMost = 512

export interface PartDiversity {
  /** Mean distance of two different members, 0 (all equal) to 1, scaled as in Variation.distance. */
  readonly meanDistance: number
  /**
   * bits, choice, layout: mean expected heterozygosity, 1 minus the sum of squared frequencies (Nei, Analysis of
   * gene diversity in subdivided populations, 1973), over the genes.
   */
  readonly heterozygosity?: number
}

export interface Diversity {
  /** Mean over the parts. */
  readonly meanDistance: number
  readonly parts: { readonly [part: string]: PartDiversity }
}

/** Diversity of a population; of fewer than two members every distance is 0. */
export function diversityOf(spec: GenomeSpec, genomes: readonly Genome[]): Diversity {
  const sample = evenlySpaced(genomes, diversityMembersMost)
  const parts: Record<string, PartDiversity> = {}
  let sum = 0
  const names = Object.keys(spec)
  for (const name of names) {
    const values = sample.map((genome) => genome[name]!)
    parts[name] = partDiversity(spec[name]!, values)
    sum += parts[name].meanDistance
  }
  return { meanDistance: names.length === 0 ? 0 : sum / names.length, parts }
}

/** `most` items in their order, the first and the last among them; all when there are no more. */
function evenlySpaced<T>(items: readonly T[], most: number): readonly T[] {
  if (items.length <= most) return items
  return Array.from({ length: most }, (_, k) => items[Math.floor((k * (items.length - 1)) / (most - 1))]!)
}

function partDiversity(encoding: Encoding, values: readonly PartValue[]): PartDiversity {
  const options = optionsOf(encoding)
  const members = values.length
  if (members === 0) return options === 0 ? { meanDistance: 0 } : { meanDistance: 0, heterozygosity: 0 }
  const genes = values[0]!.length
  if (options === 0) return { meanDistance: meanSpread(encoding, values) }
  const counts = new Float64Array(options)
  let sum = 0
  for (let gene = 0; gene < genes; gene++) {
    for (const value of values) counts[value[gene]!]!++
    // Each member adds the count of its option: together the sum of squared counts.
    let squares = 0
    for (const value of values) squares += counts[value[gene]!]!
    for (const value of values) counts[value[gene]!] = 0
    sum += 1 - squares / (members * members)
  }
  const heterozygosity = sum / genes
  // Two different members differ more often than two draws with replacement, which may be the same member.
  const meanDistance = members === 1 ? 0 : (heterozygosity * members) / (members - 1)
  return { meanDistance, heterozygosity }
}

/** How many values a gene of a categorical encoding has; 0 for encodings on a scale. */
function optionsOf(encoding: Encoding): number {
  if (encoding.kind === 'bits') return 2
  return encoding.kind === 'choice' || encoding.kind === 'layout' ? encoding.options.length : 0
}

/** Mean over genes of the mean |x - y| of two members: sum over ranks of (2 rank - members + 1) x. */
function meanSpread(encoding: Encoding, values: readonly PartValue[]): number {
  const members = values.length
  const genes = values[0]!.length
  if (members < 2) return 0
  const scaled = scaledGene(encoding)
  const column = new Float64Array(members)
  let sum = 0
  for (let gene = 0; gene < genes; gene++) {
    for (let i = 0; i < members; i++) column[i] = scaled(values[i]![gene]!)
    column.sort()
    for (let rank = 0; rank < members; rank++) sum += (2 * rank - members + 1) * column[rank]!
  }
  return sum / ((genes * members * (members - 1)) / 2)
}

/**
 * Quantiles of a score column at the given probabilities, by linear interpolation between order statistics
 * (definition 7 of Hyndman and Fan, Sample quantiles in statistical packages, 1996). Between a finite and an
 * infinite score lies Infinity.
 */
export function quantiles(column: ArrayLike<number>, probabilities: readonly number[]): Float64Array {
  check(column.length > 0, 'quantiles are taken of at least one score')
  const sorted = Float64Array.from(column).sort()
  check(!Number.isNaN(sorted[sorted.length - 1]), 'no score is NaN')
  return Float64Array.from(probabilities, (probability) => {
    check(probability >= 0 && probability <= 1, 'a probability lies in 0 to 1')
    const position = probability * (sorted.length - 1)
    const rank = Math.floor(position)
    const low = sorted[rank]!
    const fraction = position - rank
    if (fraction === 0) return low
    const high = sorted[rank + 1]!
    return low === high ? low : low + (high - low) * fraction
  })
}
