import { describe, expect, it } from 'vitest'
import { resultDigest } from './digests.js'
import { agree, type Compared } from './exactness.js'

const of = (values: number[], failed: number[] = []): Compared => {
  const failures = failed.map((simulation) => ({ simulation, reason: 'fell' }))
  const result = { values: Float64Array.from(values), failures }
  return { result, digest: resultDigest(result) }
}

describe('two results agree', () => {
  it('to the last bit where nothing less is promised', () => {
    expect(agree({}, of([1, 2]), of([1, 2]))).toBe(true)
    expect(agree({ exactness: 'bits' }, of([1, 2]), of([1, 2 + 2 ** -51]))).toBe(false)
    expect(agree({ exactness: 'bits-per-processor' }, of([1, 2]), of([1, 2 + 2 ** -51]))).toBe(false)
  })

  it('within the tolerance of each column', () => {
    const promised = { exactness: 'tolerance', tolerances: [{ absolute: 0.1 }, { relative: 0.01 }] } as const
    expect(agree(promised, of([1, 100, 5, 0]), of([1.09, 100.9, 4.95, 0]))).toBe(true)
    expect(agree(promised, of([1, 100]), of([1.11, 100]))).toBe(false)
    expect(agree(promised, of([1, 100]), of([1, 102]))).toBe(false)
  })

  it('only when the same simulations failed', () => {
    const promised = { exactness: 'tolerance', tolerances: [{ absolute: 1 }] } as const
    expect(agree(promised, of([0, 1], [0]), of([0.1, 1]))).toBe(false)
    expect(agree(promised, of([0, 1], [0]), of([0, 1.5], [0]))).toBe(true)
    expect(agree(promised, of([0, 1], [0]), of([1, 0], [1]))).toBe(false)
  })
})
