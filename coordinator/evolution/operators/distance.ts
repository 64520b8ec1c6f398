// How far apart two values of a part are, 0 (equal) to 1: on a scale the mean |difference| over the range, for
// categories the share of genes that differ (Hamming, Error detecting and error correcting codes, 1950).

import type { Encoding, PartValue } from '../../../shared/genome.js'
import { axisOf } from './scale.js'

/** The place of a gene of a real or integer part between its bounds, 0 to 1. */
export function scaledGene(encoding: Encoding): (gene: number) => number {
  if (encoding.kind === 'real') {
    const axis = axisOf(encoding)
    return betweenBounds(axis.low, axis.high, axis.to)
  }
  if (encoding.kind === 'integer') return betweenBounds(encoding.low, encoding.high, (gene) => gene)
  return (gene) => gene
}

function betweenBounds(low: number, high: number, to: (gene: number) => number): (gene: number) => number {
  return (gene) => (to(gene) - low) / (high - low)
}

/** The distance for parts of this encoding. Metric; mean over genes. */
export function distanceOf(encoding: Encoding): (a: PartValue, b: PartValue) => number {
  if (encoding.kind !== 'real' && encoding.kind !== 'integer') return shareThatDiffers
  const scaled = scaledGene(encoding)
  return (a, b) => {
    let sum = 0
    for (let i = 0; i < a.length; i++) if (a[i] !== b[i]) sum += Math.abs(scaled(a[i]!) - scaled(b[i]!))
    return sum / a.length
  }
}

function shareThatDiffers(a: PartValue, b: PartValue): number {
  let different = 0
  for (let i = 0; i < a.length; i++) if (a[i] !== b[i]) different++
  return different / a.length
}
