// What a picture says beside the drawing, and the sentences it says it in: the same in picture, replay and their
// text alternatives.

import type { Caution } from '../../../shared/problem.js'

export { alwaysCaution } from '../../../shared/making/cautions.js'

export interface ResultFact {
  readonly name: string
  readonly unit: string
  readonly value: number
  /** Of the mean over replicates; absent with fewer than two. */
  readonly standardError?: number
}

export interface PictureFacts {
  readonly search: string
  /** 'i3-01842' */
  readonly id: string
  readonly results: readonly ResultFact[]
  readonly replicates: number
  /** Which simulation is shown, such as 'replicate 1 of 16, case idle'. */
  readonly shown: string
  /** True when the numbers were used to choose this machine; false for a retest on fresh conditions. */
  readonly selected: boolean
  /** Fresh tests in which it gave no result; absent when there were none. */
  readonly failed?: { readonly simulations: number; readonly of: number; readonly because: string }
  /** How to build it, line by line. */
  readonly description: readonly string[]
  readonly cautions: readonly Caution[]
  /** Where it came from: digest, versions. */
  readonly provenance: readonly string[]
}

export function titleOf(facts: PictureFacts): string {
  return `${facts.id} of the search ${facts.search}`
}

/** Below this share of the value an error is what rounding leaves of equal numbers, no spread. */
const roundingShare = 1e-9

/** The standard error, where there is one that says anything. */
export function shownError({ value, standardError }: Omit<ResultFact, 'name' | 'unit'>): number | undefined {
  if (standardError === undefined || !(standardError > roundingShare * Math.abs(value))) return undefined
  return standardError
}

/** distance 0.812 ± 0.031 m */
export function resultText({ name, unit, value, standardError: given }: ResultFact): string {
  const ending = unit === '1' || unit === '' ? '' : ` ${unit}`
  const standardError = shownError({ value, ...(given === undefined ? {} : { standardError: given }) })
  if (standardError === undefined) return `${name} ${significant(value)}${ending}`
  const decimals = Math.min(9, Math.max(0, 1 - Math.floor(Math.log10(standardError))))
  return `${name} ${value.toFixed(decimals)} ± ${standardError.toFixed(decimals)}${ending}`
}

/** Three significant digits without a superfluous exponent. */
export function significant(value: number): string {
  return String(Number(value.toPrecision(3)))
}

/** Results with spread and sample size, and how far to trust them. */
export function resultSentence(facts: PictureFacts): string {
  const numbers = facts.results.map(resultText).join(', ')
  const hasError = facts.results.some((result) => shownError(result) !== undefined)
  const sample =
    facts.replicates === 1
      ? 'one replicate, so no uncertainty is known'
      : `mean of ${facts.replicates} replicates${hasError ? ', ± one standard error' : ''}`
  const trust = facts.selected
    ? 'Chosen for being the best: fresh tests will on average be worse.'
    : 'Measured on conditions it was not chosen on.'
  return `${numbers} (${sample}). ${trust}${failedSentence(facts)}`
}

function failedSentence({ failed }: PictureFacts): string {
  if (!failed) return ''
  return ` It failed in ${failed.simulations} of ${failed.of} fresh simulations, first because: ${failed.because}.`
}

export function cautionText({ hazard, because, consult }: Caution): string {
  return `${capital(hazard)}: ${because}. Consult: ${consult}.`
}

function capital(text: string): string {
  return text.charAt(0).toUpperCase() + text.slice(1)
}
