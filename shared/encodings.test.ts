import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import {
  bits,
  checkGenome,
  choice,
  genomeByteLength,
  genomeBytes,
  genomeFromBytes,
  genomesEqual,
  genomeText,
  integer,
  layout,
  randomGenome,
  real,
  slotsOf,
} from './encodings.js'
import type { Encoding, Genome, GenomeSpec } from './genome.js'
import { checkSpec } from './genome-check.js'
import { Refusal } from './refusals.js'
import { stream } from './streams.js'

const lengths = fc.integer({ min: 1, max: 40 })
const names = (count: number): string[] => Array.from({ length: count }, (_, i) => `option ${i}`)
const options = fc.oneof(fc.integer({ min: 2, max: 5 }), fc.constantFrom(256, 257, 300)).map(names)

/** Any encoding that a plug-in may declare. */
const anyEncoding: fc.Arbitrary<Encoding> = fc.oneof(
  fc
    .tuple(
      lengths,
      fc.double({ min: -1e9, max: 1e9, noNaN: true }),
      fc.double({ min: 1e-3, max: 1e9, noNaN: true }),
    )
    .map(([length, low, span]) => real({ length, low, high: low + span, unit: 'N/m' })),
  fc
    .tuple(
      lengths,
      fc.double({ min: 1e-300, max: 1e3, noNaN: true }),
      fc.double({ min: 1.5, max: 1e9, noNaN: true }),
    )
    .map(([length, low, ratio]) => real({ length, low, high: low * ratio, scale: 'log' })),
  fc
    .tuple(lengths, fc.integer({ min: -(2 ** 31), max: 2 ** 31 - 2 }), fc.nat())
    .map(([length, low, span]) => integer({ length, low, high: Math.min(2 ** 31 - 1, low + 1 + span) })),
  fc.tuple(lengths, options).map(([length, of]) => choice({ length, options: of })),
  lengths.map((length) => bits({ length })),
  fc
    .tuple(fc.array(fc.integer({ min: 1, max: 4 }), { minLength: 1, maxLength: 3 }), options)
    .map(([size, of]) => layout({ size, options: of })),
)
const anySpec: fc.Arbitrary<GenomeSpec> = fc
  .array(anyEncoding, { minLength: 1, maxLength: 5 })
  .map((parts) => Object.fromEntries(parts.map((encoding, i) => [`part${i}`, encoding])))

describe('encodings', () => {
  test('every specification of the constructors is one, and its founders fit it', () => {
    fc.assert(
      fc.property(anySpec, fc.nat(), (spec, number) => {
        checkSpec(spec)
        expect(checkGenome(spec, randomGenome(spec, stream(11, 'founder', 1, number)))).toBeUndefined()
      }),
      { seed: 1301 },
    )
  })

  test('a genome is its bytes: it reads back equal, and its length follows from the specification', () => {
    fc.assert(
      fc.property(anySpec, fc.nat(), (spec, number) => {
        const genome = randomGenome(spec, stream(12, 'founder', 1, number))
        const bytes = genomeBytes(spec, genome)
        expect(bytes.length).toBe(genomeByteLength(spec))
        const read = genomeFromBytes(spec, bytes)
        expect(read).toEqual(genome)
        expect(genomesEqual(spec, read, genome)).toBe(true)
        expect(genomeBytes(spec, read)).toEqual(bytes)
      }),
      { seed: 1302 },
    )
  })

  test('bytes that are damaged are refused or are another genome that fits', () => {
    fc.assert(
      fc.property(
        anySpec,
        fc.nat(),
        fc.nat(),
        fc.integer({ min: 1, max: 255 }),
        (spec, number, place, flip) => {
          const bytes = genomeBytes(spec, randomGenome(spec, stream(13, 'founder', 1, number)))
          const damaged = bytes.slice()
          const at = place % bytes.length
          damaged[at] = damaged[at]! ^ flip
          try {
            const read = genomeFromBytes(spec, damaged)
            expect(checkGenome(spec, read)).toBeUndefined()
            expect(genomeBytes(spec, read)).toEqual(damaged)
          } catch (error) {
            expect(error).toBeInstanceOf(Refusal)
          }
        },
      ),
      { seed: 1303 },
    )
  })

  const spec = {
    heights: real({ length: 2, low: 0, high: 1, unit: 'm' }),
    bays: integer({ low: 2, high: 9 }),
    material: choice({ length: 2, options: ['soft', 'stiff'] }),
    driven: bits({ length: 3 }),
    body: layout({ size: [2, 2], options: ['void', 'strut'] }),
  }
  const genome = (): { [part: string]: Float64Array | Int32Array | Uint8Array } => ({
    heights: Float64Array.of(0.25, 0.5),
    bays: Int32Array.of(4),
    material: Int32Array.of(1, 0),
    driven: Uint8Array.of(1, 0, 1),
    body: Int32Array.of(0, 1, 1, 0),
  })

  test('bytes of a genome are as documented', () => {
    expect([...genomeBytes(spec, genome())]).toEqual([
      ...[0, 0, 0, 0, 0, 0, 0xd0, 0x3f, 0, 0, 0, 0, 0, 0, 0xe0, 0x3f],
      ...[2, 1, 0, 0b101, 0, 1, 1, 0],
    ])
  })

  test('a genome reads as text with units and names of options', () => {
    expect(genomeText(spec, genome())).toEqual([
      'heights: 0.25, 0.5 m',
      'bays: 4',
      'material: stiff, soft',
      'driven: 101',
      'body: void, strut / strut, void',
    ])
  })

  test.each<[string, string, object]>([
    ['a part is missing', 'bays', { bays: undefined }],
    ['another kind of array', 'heights', { heights: [0.25, 0.5] }],
    ['a wrong length', 'heights', { heights: Float64Array.of(0.5) }],
    ['a NaN', 'heights', { heights: Float64Array.of(0.5, NaN) }],
    ['a number above high', 'heights', { heights: Float64Array.of(0.5, 1.0000000000000002) }],
    ['an integer below low', 'bays', { bays: Int32Array.of(1) }],
    ['an option that does not exist', 'material', { material: Int32Array.of(0, 2) }],
    ['a bit that is none', 'driven', { driven: Uint8Array.of(0, 1, 2) }],
    ['a negative slot', 'body', { body: Int32Array.of(0, 0, 0, -1) }],
    ['an unknown part', 'tail', { tail: Int32Array.of(0) }],
  ])('a genome with %s is told by its part', (_, part, change) => {
    expect(checkGenome(spec, genome())).toBeUndefined()
    expect(checkGenome(spec, { ...genome(), ...change })).toMatch(new RegExp(`^part ${part}: .+`))
  })

  test.each<[string, string, unknown]>([
    ['genome', 'nothing', undefined],
    ['genome', 'a list', [real({ low: 0, high: 1 })]],
    ['genome', 'no part', {}],
    ['genome.1', 'a name that would change the order', { 1: bits({ length: 1 }) }],
    [
      'genome.__proto__',
      'a name of the language',
      JSON.parse('{"__proto__": {"kind": "bits", "length": 1}}'),
    ],
    ['genome.a', 'no encoding', { a: 3 }],
    ['genome.a.kind', 'an unknown kind', { a: { kind: 'toString' } }],
    ['genome.a.length', 'no length', { a: { kind: 'bits' } }],
    ['genome.a.length', 'half a slot', { a: bits({ length: 1.5 }) }],
    ['genome.a.high', 'bounds the wrong way round', { a: real({ low: 1, high: 0 }) }],
    ['genome.a.high', 'bounds too far apart', { a: real({ low: -1.7e308, high: 1.7e308 }) }],
    ['genome.a.low', 'a NaN', { a: real({ low: NaN, high: 0 }) }],
    ['genome.a.low', 'a logarithm of 0', { a: real({ low: 0, high: 1, scale: 'log' }) }],
    ['genome.a.high', 'an integer beyond 32 bits', { a: integer({ low: 0, high: 2 ** 31 }) }],
    ['genome.a.options', 'one option', { a: choice({ options: ['only'] }) }],
    ['genome.a.options', 'options that are equal', { a: choice({ options: ['a', 'a'] }) }],
    ['genome.a.size', 'too many axes', { a: layout({ size: [1, 1, 1, 1], options: ['a', 'b'] }) }],
    ['genome.a', 'an unknown field', { a: { ...bits({ length: 1 }), hight: 3 } }],
    ['genome', 'too many slots', { a: layout({ size: [1000, 1000], options: ['a', 'b'] }) }],
  ])('refuses at %s: %s', (field, _, spec) => {
    try {
      checkSpec(spec)
      expect.unreachable('the specification was accepted')
    } catch (error) {
      expect(error).toBeInstanceOf(Refusal)
      expect((error as Refusal).code).toBe('not-a-problem')
      expect((error as Refusal).where?.field).toBe(field)
      expect((error as Refusal).detail.length).toBeGreaterThan(10)
    }
  })

  test('founders are spread evenly, on a log scale by order of magnitude', () => {
    const wide = {
      k: real({ length: 40_000, low: 1, high: 1e4, scale: 'log' }),
      n: integer({ length: 40_000, low: -1, high: 1 }),
    }
    const founder: Genome = randomGenome(wide, stream(14, 'founder'))
    const decades = [0, 0, 0, 0]
    for (const x of founder.k!) decades[Math.min(3, Math.floor(Math.log10(x)))]!++
    const kinds = [0, 0, 0]
    for (const x of founder.n!) kinds[x + 1]!++
    // 4 standard errors of a binomial count.
    for (const n of decades) expect(Math.abs(n - 10_000)).toBeLessThan(4 * Math.sqrt(40_000 * 0.25 * 0.75))
    for (const n of kinds) expect(Math.abs(n - 40_000 / 3)).toBeLessThan(4 * Math.sqrt((40_000 * 2) / 9))
  })

  test('a layout has a slot for every place of its lattice', () => {
    expect(slotsOf(layout({ size: [3, 4, 5], options: ['a', 'b'] }))).toBe(60)
  })
})
