import { describe, expect, test } from 'vitest'
import { bits, checkGenome, choice, layout, randomGenome, real } from '../../../shared/encodings.js'
import type { Genome } from '../../../shared/genome.js'
import { stream } from '../../../shared/streams.js'
import { defaultOperators } from './tables.js'
import { makeVariation } from './variation.js'

const spec = {
  body: layout({ size: [3, 4], options: ['empty', 'soft', 'stiff'] }),
  drive: real({ low: 0, high: 1, length: 6 }),
  gait: choice({ options: ['wave', 'hop'], length: 2 }),
  switches: bits({ length: 16 }),
}
const spare = (use: number) => stream(20261201, 'spare', 7, use)

describe('variation of whole genomes', () => {
  test('a founder is a random genome; children and mutants are genomes of the specification', () => {
    const variation = makeVariation(spec, defaultOperators(spec))
    const a = variation.founder(spare(1))
    const b = variation.founder(spare(2))
    expect(a).toEqual(randomGenome(spec, spare(1)))
    for (let use = 10; use < 60; use++) {
      for (const genome of [variation.cross(a, b, spare(use)), variation.mutate(a, spare(use))]) {
        expect(checkGenome(spec, genome)).toBeUndefined()
        expect(Object.keys(genome)).toEqual(Object.keys(spec))
      }
    }
    expect(a).toEqual(randomGenome(spec, spare(1)))
    expect(b).toEqual(randomGenome(spec, spare(2)))
  })

  test('everything new passes repair', () => {
    const repair = (genome: Genome): Genome => ({
      ...genome,
      drive: genome.drive!.map(() => 0.25) as Float64Array,
    })
    const variation = makeVariation(spec, defaultOperators(spec), { repair })
    const a = variation.founder(spare(1))
    const b = variation.founder(spare(2))
    for (const genome of [a, b, variation.cross(a, b, spare(3)), variation.mutate(a, spare(4))]) {
      expect(genome.drive).toEqual(new Float64Array(6).fill(0.25))
    }
  })

  test('distance is the mean over the parts', () => {
    const variation = makeVariation(spec, defaultOperators(spec))
    const a = variation.founder(spare(1))
    expect(variation.distance(a, variation.founder(spare(1)))).toBe(0)
    const opposite = { ...a, switches: a.switches!.map((bit) => 1 - bit) as Uint8Array }
    expect(variation.distance(a, opposite)).toBe(0.25)
  })

  test('a part without operators or with those of another encoding is a broken promise', () => {
    const operators = defaultOperators(spec)
    const { body: _, ...rest } = operators
    expect(() => makeVariation(spec, rest)).toThrow("part 'body' has a plan of operators")
    expect(() => makeVariation(spec, { ...operators, body: operators.drive! })).toThrow(
      "crossover 'sbx' fits layout parts",
    )
  })
})
