// Operators on real parts: simulated binary crossover, polynomial and Gaussian mutation. On a logarithmic scale
// they work on the logarithms (scale.ts). Letters as in the sources.

import { check } from '../../../shared/check.js'
import { pow } from '../../../shared/detmath/index.js'
import type { Encoding, RealEncoding } from '../../../shared/genome.js'
import { numberSetting } from '../settings.js'
import type { SettingRow } from '../types.js'
import { gapsOf } from './gaps.js'
import { type CrossoverRow, changesRow, type MutationRow, rateOf, realsOf } from './rows.js'
import { axisOf } from './scale.js'

function realOf(encoding: Encoding): RealEncoding {
  check(encoding.kind === 'real', 'the operator fits real parts')
  return encoding
}

const distributionIndexRow: SettingRow = {
  kind: 'number',
  default: 20,
  low: 0,
  high: 1000,
  help: 'distribution index eta: the larger, the nearer to the parents',
}

// ------------------------------------------------------------------------- simulated binary crossover
//
// Parents y1 < y2 give c1 = ((y1 + y2) - beta (y2 - y1)) / 2 and c2 = ((y1 + y2) + beta (y2 - y1)) / 2.
// The spread factor beta has the distribution function beta^(eta+1) / 2 up to 1 and 1 - beta^-(eta+1) / 2 above.
// With bounds it is cut off where the child would reach the bound, betaMost = 1 + 2 room / (y2 - y1), and scaled:
//
//   alpha = 2 - betaMost^-(eta+1)
//   beta  = (u alpha)^(1/(eta+1))            for u <= 1 / alpha
//         = (1 / (2 - u alpha))^(1/(eta+1))  above

/** The spread factor at u in [0, 1), with at most `betaMost` (Infinity: without bounds). */
export function spreadFactor(u: number, eta: number, betaMost: number): number {
  const exponent = eta + 1
  const alpha = 2 - (betaMost === Number.POSITIVE_INFINITY ? 0 : pow(betaMost, -exponent))
  const mass = u * alpha
  return mass <= 1 ? pow(mass, 1 / exponent) : pow(1 / (2 - mass), 1 / exponent)
}

/** The lower of the two children of y1 < y2, not below `low`. */
export function lowerChild(y1: number, y2: number, low: number, eta: number, u: number): number {
  const gap = y2 - y1
  return 0.5 * (y1 + y2 - spreadFactor(u, eta, 1 + (2 * (y1 - low)) / gap) * gap)
}

/** The upper of the two children of y1 < y2, not above `high`. */
export function upperChild(y1: number, y2: number, high: number, eta: number, u: number): number {
  const gap = y2 - y1
  return 0.5 * (y1 + y2 + spreadFactor(u, eta, 1 + (2 * (high - y2)) / gap) * gap)
}

export const simulatedBinaryCrossover: CrossoverRow = {
  name: 'sbx',
  title: 'Simulated binary crossover (SBX)',
  summary:
    'each gene is exchanged with a chance; then it lies about one parent, about as far away as the other is',
  source:
    'Deb and Agrawal, Simulated binary crossover for continuous search space, 1995; bounded form: common practice',
  encodings: ['real'],
  settings: {
    distributionIndex: distributionIndexRow,
    exchange: { kind: 'number', default: 0.5, low: 0, high: 1, help: 'chance that a gene is crossed at all' },
  },
  build: (encoding, settings) => {
    const axis = axisOf(realOf(encoding))
    const eta = numberSetting(settings, 'distributionIndex')
    const exchange = numberSetting(settings, 'exchange')
    return (a, b, stream) => {
      const first = realsOf(a)
      const second = realsOf(b)
      const child = first.slice()
      for (let i = 0; i < child.length; i++) {
        if (first[i] === second[i] || stream.uniform() >= exchange) continue
        const u = stream.uniform()
        const x = axis.to(first[i]!)
        const y = axis.to(second[i]!)
        // Different values can have equal logarithms.
        if (x === y) continue
        const y1 = Math.min(x, y)
        const y2 = Math.max(x, y)
        const place = stream.chance(1, 2)
          ? lowerChild(y1, y2, axis.low, eta, u)
          : upperChild(y1, y2, axis.high, eta, u)
        child[i] = axis.from(place)
      }
      return child
    }
  },
}

// -------------------------------------------------------------------------------- polynomial mutation
//
// The deviation delta, as a share of the range, has density (eta + 1) / 2 (1 - |delta|)^eta in (-1, 1); with
// bounds each side is cut off at the room there is (below, above: shares of the range) and scaled:
//
//   u <= 1/2:  delta = (2 u + (1 - 2 u) (1 - below)^(eta+1))^(1/(eta+1)) - 1
//   above:     delta = 1 - (2 (1 - u) + (2 u - 1) (1 - above)^(eta+1))^(1/(eta+1))

/** The deviation at u in [0, 1), -below to above; without bounds for below = above = 1. */
export function polynomialDeviation(u: number, eta: number, below: number, above: number): number {
  const exponent = eta + 1
  if (u <= 0.5) return pow(2 * u + (1 - 2 * u) * pow(1 - below, exponent), 1 / exponent) - 1
  return 1 - pow(2 * (1 - u) + (2 * u - 1) * pow(1 - above, exponent), 1 / exponent)
}

export const polynomialMutation: MutationRow = {
  name: 'polynomial',
  title: 'Polynomial mutation',
  summary: 'changed genes move by a share of the range, mostly small, cut off at the bounds',
  source:
    'Deb and Goyal, A combined genetic adaptive search (GeneAS) for engineering design, 1996; bounded form: common practice',
  encodings: ['real'],
  settings: { changes: changesRow, distributionIndex: distributionIndexRow },
  build: (encoding, settings) => {
    const axis = axisOf(realOf(encoding))
    const eta = numberSetting(settings, 'distributionIndex')
    const gap = gapsOf(rateOf(settings, 'changes', encoding))
    const range = axis.high - axis.low
    return (value, stream) => {
      let i = gap(stream)
      if (i >= value.length) return value
      const mutant = realsOf(value).slice()
      for (; i < mutant.length; i += 1 + gap(stream)) {
        const y = axis.to(mutant[i]!)
        const below = (y - axis.low) / range
        const above = (axis.high - y) / range
        mutant[i] = axis.from(y + polynomialDeviation(stream.uniform(), eta, below, above) * range)
      }
      return mutant
    }
  },
}

// ---------------------------------------------------------------------------------- Gaussian mutation

/**
 * Folds x into [0, 1] as if both ends were mirrors. A step that is as likely up as down stays so: without
 * selection every value remains equally likely, whereas clamping would heap genes on the bounds.
 */
export function reflect(x: number): number {
  const along = x - 2 * Math.floor(x / 2)
  return along <= 1 ? along : 2 - along
}

export const gaussianMutation: MutationRow = {
  name: 'gaussian',
  title: 'Gaussian mutation',
  summary: 'changed genes move by a normal step, reflected at the bounds',
  source: 'Rechenberg, Evolutionsstrategie, 1973 (normal steps); reflection at bounds: common practice',
  encodings: ['real'],
  settings: {
    changes: changesRow,
    sigma: {
      kind: 'number',
      default: 0.1,
      low: 0,
      high: 10,
      help: 'standard deviation of a step as a fraction of the range (of its logarithm on a log scale)',
    },
  },
  build: (encoding, settings) => {
    const axis = axisOf(realOf(encoding))
    const gap = gapsOf(rateOf(settings, 'changes', encoding))
    const range = axis.high - axis.low
    const sigma = numberSetting(settings, 'sigma')
    return (value, stream) => {
      let i = gap(stream)
      if (i >= value.length) return value
      const mutant = realsOf(value).slice()
      for (; i < mutant.length; i += 1 + gap(stream)) {
        // In shares of the range, which cannot overflow.
        const share = (axis.to(mutant[i]!) - axis.low) / range
        mutant[i] = axis.from(axis.low + reflect(share + sigma * stream.normal()) * range)
      }
      return mutant
    }
  },
}
