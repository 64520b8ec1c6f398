import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { Refusal } from '../../shared/refusals.js'
import type { Individual } from '../evolution/types.js'
import {
  bytesOfEvaluations,
  bytesOfIndividuals,
  bytesOfNumbers,
  evaluationsOfBytes,
  failuresOfText,
  individualsOfBytes,
  numbersOfBytes,
  textOfFailures,
} from './rows.js'

const what = () => 'a row'

describe('evaluations of a run of commits', () => {
  test('come back whatever they are', () => {
    const count = fc.integer({ min: 1, max: 2 ** 32 })
    fc.assert(
      fc.property(count, fc.array(count, { minLength: 1, maxLength: 50 }), (first, evaluations) => {
        const bytes = bytesOfEvaluations(first, evaluations)
        expect(evaluationsOfBytes(first, evaluations.length, bytes, 'x')).toEqual(evaluations)
      }),
    )
  })
  test('take no room in order of proposal, and a byte each near to it', () => {
    expect(bytesOfEvaluations(41, [41, 42, 43])).toBeNull()
    expect(bytesOfEvaluations(41, [42, 41, 43])?.length).toBe(3)
  })
})

describe('numbers of a result', () => {
  const finite = fc.double({ noNaN: true, noDefaultInfinity: true })
  test('keep every bit, also from a part of a larger array and from shared memory', () => {
    fc.assert(
      fc.property(fc.array(finite), (values) => {
        const larger = Float64Array.from([7, ...values, 7])
        const bytes = bytesOfNumbers(larger.subarray(1, values.length + 1))
        for (const given of [bytes, Uint8Array.from(bytes), Buffer.from(bytes)]) {
          expect(numbersOfBytes(given, what)).toEqual(Float64Array.from(values))
        }
      }),
    )
  })
  test('that are no doubles or not finite are damage', () => {
    for (const bytes of [
      new Uint8Array(7),
      bytesOfNumbers(Float64Array.of(1, Number.NaN)),
      new Uint8Array(16).fill(255),
    ]) {
      expect(() => numbersOfBytes(bytes, what)).toThrow(Refusal)
    }
  })
})

describe('failures of a result', () => {
  test('are nothing when there is none, and come back otherwise', () => {
    expect(textOfFailures([])).toBeNull()
    const reasons = fc.array(fc.record({ simulation: fc.nat(), reason: fc.string({ unit: 'grapheme' }) }))
    fc.assert(
      fc.property(reasons, (failures) => {
        expect(failuresOfText(textOfFailures(failures), what)).toEqual(failures)
      }),
    )
  })
  test('of another shape are damage', () => {
    for (const text of ['{}', '[[1]]', '[[1,2]]', '[[-1,"x"]]', '[', '[["__proto__","x"]]']) {
      expect(() => failuresOfText(text, what), text).toThrow(Refusal)
    }
  })
})

describe('emigrants', () => {
  const emigrant: Individual = {
    id: 2 ** 41 + 7,
    // A part may be called anything, even what JavaScript gives a meaning of its own.
    genome: Object.fromEntries([
      ['__proto__', Float64Array.of(-0, 1)],
      ['legs', Uint8Array.of(1, 0)],
      ['bays', Int32Array.of(-5)],
    ]),
    parents: [2 ** 41 + 1],
    origin: 'crossed',
    bornAtCommit: 12,
    blocks: [{ island: 2, evaluation: 9, firstReplicate: 0, replicates: 2, failedSimulations: 1 }],
    values: Float64Array.of(1, 2, 3, 0, 0, 0),
    replicates: 2,
    failedSimulations: 1,
    score: Float64Array.of(Number.POSITIVE_INFINITY, -3),
    age: 4,
  }
  test('come back by value, with infinite scores and the bits of their genome', () => {
    const [back] = individualsOfBytes(bytesOfIndividuals([emigrant]))
    expect(back).toEqual(emigrant)
    const values = Object.getOwnPropertyDescriptor(back!.genome, '__proto__')?.value as Float64Array
    expect(Object.is(values[0], -0)).toBe(true)
  })
  test('whose bytes are cut or changed in their lengths are refused', () => {
    const bytes = bytesOfIndividuals([emigrant])
    for (let length = 0; length < bytes.length; length++) {
      expect(() => individualsOfBytes(bytes.subarray(0, length)), String(length)).toThrow(Refusal)
    }
    expect(() => individualsOfBytes(Uint8Array.from([...bytes, 0]))).toThrow(Refusal)
  })
})
