// Jobs and answers survive the way through bytes exactly, and bytes that nobody of ours wrote are refused by name.

import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { resultDigest } from '../digests.js'
import type { WorkItem } from '../result.js'
import {
  type Answers,
  contentWord,
  decodeAnswers,
  decodeJob,
  encodeAnswers,
  encodeJob,
  type Job,
  Malformed,
} from './codec.js'
import { protocolVersion } from './messages.js'

const id = fc.nat({ max: 2 ** 31 - 1 })
const genome = fc.uint8Array({ maxLength: 40 })

const items = fc.array(
  fc.record({
    island: id,
    evaluation: id,
    attempt: id,
    individual: fc.maxSafeNat(),
    firstReplicate: id,
    replicates: id,
    expectedCost: id,
    genome,
  }),
  { minLength: 1, maxLength: 20 },
)

function jobOf(parts: readonly Omit<WorkItem, 'purpose' | 'isolation' | 'avoid'>[]): Job {
  const common = { purpose: 'confirm', isolation: 'alone', avoid: ['h/1/t2'] } as const
  const header = {
    protocol: protocolVersion,
    search: 's',
    record: 'r',
    instance: 'i',
    dispatch: 2 ** 52 + 1,
    ...common,
    avoid: [...common.avoid],
    avoidHosts: ['h2'],
  }
  return { header, items: parts.map((part) => ({ ...part, ...common, avoid: [...common.avoid] })) }
}

function answersOf(values: readonly (readonly number[])[]): Answers {
  return {
    header: {
      protocol: protocolVersion,
      search: 's',
      record: 'r',
      agent: 'a',
      host: 'h',
      processor: 'p',
      pluginDigest: '0'.repeat(64),
      skerry: '0',
    },
    answers: values.map((row, index) => {
      const failures = row.length > 2 ? [{ simulation: 1, reason: 'it tore' }] : []
      const result = { values: Float64Array.from(row), failures }
      return {
        dispatch: 7,
        index,
        item: { island: 1, evaluation: index, attempt: 2, purpose: index % 2 ? 'confirm' : 'evaluate' },
        ...(index % 3 ? { content: 2 ** 53 - 1 - index } : {}),
        result,
        digest: resultDigest(result),
        executor: { kind: 'thread', worker: `h/1/t${index % 2}`, host: 'h', processor: 'p' },
        cpuSeconds: 0.25,
        wallSeconds: 1e-3,
      }
    }),
    losses: [
      {
        dispatch: 7,
        index: 3,
        cause: 'died',
        detail: 'bang',
        executor: { kind: 'process', worker: 'h/2', host: 'h' },
      },
    ],
  }
}

const finite = fc.double({ noNaN: true, noDefaultInfinity: true }).map((x) => (x === 0 ? 0 : x))

describe('the way through bytes', () => {
  test('keeps every job', () => {
    fc.assert(
      fc.property(items, (parts) => {
        expect(decodeJob(encodeJob(jobOf(parts)))).toEqual(jobOf(parts))
      }),
      { seed: 41, numRuns: 200 },
    )
  })

  test('keeps all answers, to the last bit', () => {
    fc.assert(
      fc.property(fc.array(fc.array(finite, { maxLength: 5 }), { maxLength: 12 }), (values) => {
        expect(decodeAnswers(encodeAnswers(answersOf(values)))).toEqual(answersOf(values))
      }),
      { seed: 42, numRuns: 200 },
    )
  })
})

describe('bytes that nobody of ours wrote', () => {
  test.each([
    ['nothing', new Uint8Array()],
    ['text', new TextEncoder().encode('{"header":{}}')],
    ['another message', encodeJob(jobOf([]))],
  ])('%s are refused', (_, bytes) => {
    expect(() => decodeJob(bytes)).toThrow(Malformed)
    expect(() => decodeAnswers(bytes)).toThrow(Malformed)
  })

  test('any byte of answers changed, cut or added: refused, or another message that is whole', () => {
    const bytes = encodeAnswers(answersOf([[1, 2, 3], [4]]))
    let refused = 0
    for (let i = 0; i < bytes.length; i++) {
      const changed = bytes.slice()
      changed[i] = changed[i]! ^ 0x55
      try {
        decodeAnswers(changed)
      } catch (fault) {
        expect(fault).toBeInstanceOf(Malformed)
        refused++
      }
    }
    expect(refused).toBeGreaterThan(bytes.length / 2)
    for (let end = 0; end < bytes.length; end++)
      expect(() => decodeAnswers(bytes.slice(0, end))).toThrow(Malformed)
  })

  test('values that are not finite, and a digest that is not theirs, are refused', () => {
    const good = answersOf([[1]])
    const result = { values: Float64Array.of(Number.NaN), failures: [] }
    const withNaN = { ...good, answers: [{ ...good.answers[0]!, result, digest: good.answers[0]!.digest }] }
    expect(() => decodeAnswers(encodeAnswers(withNaN))).toThrow('not finite')
    const forged = {
      ...good,
      answers: [{ ...good.answers[0]!, result: { ...result, values: Float64Array.of(2) } }],
    }
    expect(() => decodeAnswers(encodeAnswers(forged))).toThrow('digest')
  })
})

test('the word of a piece of work changes with everything that is simulated, and with nothing else', () => {
  const item = { individual: 2 ** 40 + 5, firstReplicate: 3, replicates: 2, genome: Uint8Array.of(1, 2, 3) }
  const words = [
    item,
    { ...item, individual: 5 },
    { ...item, individual: 2 ** 40 + 6 },
    { ...item, firstReplicate: 2 },
    { ...item, replicates: 3 },
    { ...item, genome: Uint8Array.of(1, 2, 4) },
    { ...item, genome: Uint8Array.of(1, 2, 3, 0) },
    { ...item, genome: new Uint8Array() },
  ].map(contentWord)
  expect(new Set(words).size).toBe(words.length)
  expect(words.every((word) => Number.isSafeInteger(word) && word > 0)).toBe(true)
  expect(contentWord({ ...item, genome: item.genome.slice() })).toBe(words[0])
})

test('words of many pieces of work hardly ever meet', () => {
  const words = new Set<number>()
  const count = 20_000
  for (let i = 0; i < count; i++) {
    const bytes = Uint8Array.of(i % 256, i >> 8, 7)
    words.add(contentWord({ individual: i, firstReplicate: 0, replicates: 1, genome: bytes }))
  }
  // By chance, 20,000 words of 53 bits meet with probability 2e8 / 2^53, about 2e-8.
  expect(words.size).toBe(count)
})
