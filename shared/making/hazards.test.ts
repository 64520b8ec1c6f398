// Every hazard has a case that shows it and one that does not; what is not declared is shown.

import { describe, expect, test } from 'vitest'
import type { Caution } from '../problem.js'
import { alwaysCaution, cautionOf, cautionsOf, fieldWords, hazardsOf } from './cautions.js'
import { above, allOf, anyOf, type Declared, isTrue } from './conditions.js'
import { gasEnergyJ, hazards } from './hazards.js'
import { noMachine, places, type Use, wettings } from './types.js'

/** Everything declared, and nothing that could hurt. */
const harmless: Required<Declared> = {
  places: ['bench'],
  wetted: 'nothing',
  energy: ['none'],
  gasPressurePa: 0,
  gasVolumeM3: 0,
  liquidPressurePa: 0,
  storedElasticJ: 0,
  suspendedKg: 0,
  suspendedHeightM: 0,
  movingParts: false,
  peakForceN: 0,
  rotationHz: 0,
  voltageV: 0,
  battery: 'none',
  hottestC: 20,
  massKg: 0.1,
  onRunningMachine: false,
  vibrationHz: 0,
  upstreamOfPump: false,
  methods: ['cutting-to-length'],
}

interface Case {
  readonly shows: Declared
  readonly hides: Declared
  /** What the caution says of this machine's own numbers. */
  readonly says?: RegExp
}
const cases: { readonly [key: string]: Case } = {
  'compressed-gas': {
    shows: { gasPressurePa: 60e3, gasVolumeM3: 0.001 },
    hides: { gasPressurePa: 0 },
    says: /up to 60 kPa gauge, 50\.\d J in 1 l, above the 50 kPa where/,
  },
  'liquid-pressure': {
    shows: { liquidPressurePa: 1e6 },
    hides: { liquidPressurePa: 0 },
    says: /1000 kPa gauge, enough to be driven through skin/,
  },
  'stored-spring-energy': {
    shows: { storedElasticJ: 0.09 },
    hides: { storedElasticJ: 0.08 },
    says: /0\.09 J/,
  },
  'suspended-load': {
    shows: { suspendedKg: 2, suspendedHeightM: 1.5 },
    hides: { suspendedKg: 0 },
    says: /2 kg hangs .* can fall 1\.5 m \(29\.4 J\)/,
  },
  pinching: {
    shows: { movingParts: true, peakForceN: 150 },
    hides: { movingParts: false, peakForceN: 150 },
    says: /150 N, more than the 140 N/,
  },
  'rotating-parts': { shows: { rotationHz: 2 }, hides: { rotationHz: 0 }, says: /120 times a minute/ },
  'unexpected-start': { shows: { energy: ['mains'] }, hides: { energy: ['hand'] }, says: /driven by mains/ },
  'electric-shock': { shows: { voltageV: 230 }, hides: { voltageV: 48 }, says: /230 V/ },
  'electricity-in-wet-places': {
    shows: { voltageV: 24, places: ['pump-room'] },
    hides: { voltageV: 24, places: ['dry-room'] },
    says: /24 V, more than the 12 V AC/,
  },
  'lithium-cells': { shows: { battery: 'lithium' }, hides: { battery: 'alkaline' } },
  'gassing-batteries': { shows: { battery: 'lead-acid' }, hides: { battery: 'lithium' } },
  'burnable-gas': { shows: { voltageV: 5, places: ['sewer'] }, hides: { voltageV: 5, places: ['bench'] } },
  'hot-actuators': { shows: { hottestC: 90 }, hides: { hottestC: 43 }, says: /90 degrees C/ },
  'drinking-water': { shows: { wetted: 'drinking-water' }, hides: { wetted: 'rain' } },
  'foul-water': { shows: { wetted: 'waste-water' }, hides: { wetted: 'raw-water' } },
  'bad-air': { shows: { places: ['bench', 'culvert'] }, hides: { places: ['bench', 'outdoors'] } },
  flooding: { shows: { places: ['intake'] }, hides: { places: ['outdoors'] } },
  'blocked-pipe': {
    shows: { places: ['pipe'], massKg: 0.4 },
    hides: { places: ['tank'] },
    says: /0\.4 kg can stay/,
  },
  'parts-into-pump': { shows: { upstreamOfPump: true }, hides: { upstreamOfPump: false } },
  'mount-on-running-machine': {
    shows: { onRunningMachine: true, suspendedKg: 1 },
    hides: { onRunningMachine: false },
    says: /the mount holds 1 kg/,
  },
  'beside-water': { shows: { places: ['intake'] }, hides: { places: ['pipe'] } },
  lifting: { shows: { massKg: 16 }, hides: { massKg: 15 }, says: /the machine is 16 kg/ },
  fatigue: { shows: { vibrationHz: 25 }, hides: { vibrationHz: 0 }, says: /15\.1 million cycles/ },
  'uncured-resins': { shows: { methods: ['casting'] }, hides: { methods: ['machining'] } },
  'printing-fumes': { shows: { methods: ['resin-printing'] }, hides: { methods: ['gluing'] } },
  'sharp-edges': { shows: { methods: ['sheet-metal-cutting'] }, hides: { methods: ['casting'] } },
}

const keysOf = (declared: Declared) => hazardsOf(declared).map(({ key }) => key)
const rowOf = (key: string) => hazards.find((row) => row.key === key)!

describe('the table of hazards', () => {
  test('has a case for every row, and every row a key of its own', () => {
    expect(Object.keys(cases).sort()).toEqual(hazards.map(({ key }) => key).sort())
    expect(new Set(hazards.map(({ hazard }) => hazard)).size).toBe(hazards.length)
  })

  test.each(Object.entries(cases))(
    '%s: shown by its case, hidden by the other',
    (key, { shows, hides, says }) => {
      expect(keysOf({ ...harmless, ...shows })).toContain(key)
      expect(keysOf({ ...harmless, ...hides })).not.toContain(key)
      const { because, consult } = cautionOf(rowOf(key), { ...harmless, ...shows })
      expect(because).not.toMatch(/not declared|undefined|NaN/)
      expect(because).toMatch(says ?? /[a-z]{4}/)
      expect(consult.length).toBeGreaterThan(20)
    },
  )

  test.each(Object.entries(cases))('%s: shown with what is missing when that is not declared', (key) => {
    const { fields } = rowOf(key).when
    const missing = Object.fromEntries(fields.map((field) => [field, undefined]))
    const declared = { ...harmless, ...missing } as Declared
    expect(keysOf(declared)).toContain(key)
    const { because } = cautionOf(rowOf(key), declared)
    for (const field of fields) expect(because).toContain(fieldWords[field])
    expect(because).not.toMatch(/undefined|NaN/)
  })

  test('is empty for what declares everything harmless, and whole for what declares nothing', () => {
    expect(keysOf(harmless)).toEqual([])
    expect(hazardsOf({})).toEqual(hazards)
  })

  test('reads well after "Hazard: because. Consult: ..." and names a source of every number', () => {
    for (const { hazard, why, consult, source } of hazards) {
      expect(hazard).toMatch(/^[A-Z]/)
      for (const text of [why, consult]) expect(text).not.toMatch(/\.$/)
      expect(source).toMatch(/from memory|no source/)
    }
  })
})

test('conditions are in three values: one certain no hides, one certain yes shows, else unknown', () => {
  const hot = above('hottestC', 43)
  const moves = isTrue('movingParts')
  expect(allOf(hot, moves).holds({ hottestC: 20 })).toBe('no')
  expect(allOf(hot, moves).holds({ hottestC: 90 })).toBe('unknown')
  expect(allOf(hot, moves).holds({ hottestC: 90, movingParts: true })).toBe('yes')
  expect(anyOf(hot, moves).holds({ hottestC: 90 })).toBe('yes')
  expect(anyOf(hot, moves).holds({ hottestC: 20 })).toBe('unknown')
  expect(anyOf(hot, moves).holds({ hottestC: 20, movingParts: false })).toBe('no')
})

test('energy of gas is what it does while it expands without heat to the atmosphere', () => {
  // Recomputed: integral of p dV along p V^1.4, 20,000 trapezia.
  const atmospherePa = 101_325
  for (const gaugePa of [50e3, 600e3]) {
    const p1 = gaugePa + atmospherePa
    const v1 = 0.002
    const v2 = v1 * (p1 / atmospherePa) ** (1 / 1.4)
    const steps = 20_000
    let workJ = 0
    for (let i = 0; i < steps; i++) {
      const at = (j: number) => p1 * (v1 / (v1 + ((v2 - v1) * j) / steps)) ** 1.4
      workJ += ((at(i) + at(i + 1)) / 2) * ((v2 - v1) / steps)
    }
    expect(Math.abs(gasEnergyJ(gaugePa, v1) / workJ - 1)).toBeLessThan(1e-8)
  }
  expect(gasEnergyJ(0, 1)).toBe(0)
})

// Where a caution begins, or grows: all from memory, none read. EN 71-1, Safety of toys, 2014; IEC 60364-4-41, 2005;
// ISO 13732-1, 2006; ISO 11228-1, 2003. The caution is hidden at the bound itself and shown just above it.
test.each([
  ['stored-spring-energy', 'storedElasticJ', 0.08],
  ['electric-shock', 'voltageV', 50],
  ['hot-actuators', 'hottestC', 43],
  ['lifting', 'massKg', 15],
] as const)('%s begins above %s %d', (key, field, bound) => {
  expect(keysOf({ ...harmless, [field]: bound })).not.toContain(key)
  expect(keysOf({ ...harmless, [field]: bound * 1.001 })).toContain(key)
})

// ISO/TS 15066, 2016 (140 N on a hand); Directive 2014/68/EU (0.5 bar); IEC 60364-7-702, 2010 (12 V AC in water);
// liquid that is driven through skin (about 7 bar): from memory.
test.each([
  ['pinching', { movingParts: true }, 'peakForceN', 140, /more than the 140 N/],
  ['compressed-gas', {}, 'gasPressurePa', 50e3, /where pressure-equipment law begins/],
  ['electricity-in-wet-places', { wetted: 'raw-water' }, 'voltageV', 12, /more than the 12 V AC/],
  ['liquid-pressure', {}, 'liquidPressurePa', 700e3, /driven through skin/],
] as const)('%s says more beyond its bound', (key, given, field, bound, words) => {
  const said = (value: number) => cautionOf(rowOf(key), { ...harmless, ...given, [field]: value }).because
  expect(said(bound)).not.toMatch(words)
  expect(said(bound * 1.01)).toMatch(words)
})

test('every place and water that is wet is wet for electricity, and every confined one has bad air', () => {
  const dry = new Set(['bench', 'dry-room'])
  const confined = new Set(['culvert', 'pipe', 'tank', 'pump-well', 'sewer'])
  for (const place of places) {
    const keys = keysOf({ ...harmless, voltageV: 5, places: [place] })
    expect(keys.includes('electricity-in-wet-places')).toBe(!dry.has(place))
    for (const key of ['bad-air', 'burnable-gas']) expect(keys.includes(key)).toBe(confined.has(place))
  }
  for (const wetted of wettings) {
    const keys = keysOf({ ...harmless, voltageV: 5, wetted })
    expect(keys.includes('electricity-in-wet-places')).toBe(wetted !== 'nothing')
  }
})

describe('the cautions of a problem', () => {
  const genome = { x: Float64Array.of(0.5) }
  const own: Caution = { hazard: 'Silt', because: 'it is slippery', consult: 'the operator' }
  const { methods, ...use } = harmless
  const process = { name: 'bench', methods, stock: [], actuators: [] }
  const names = (problem: Parameters<typeof cautionsOf>[0]) =>
    cautionsOf(problem, genome).map(({ hazard }) => hazard)
  const everything = hazards.map(({ hazard }) => hazard)

  test('that declares nothing are all rows, and that is said first', () => {
    expect(names({})).toEqual(['Use not declared', ...everything])
    expect(cautionsOf({}, genome)[0]!.because).toMatch(/declares no use/)
  })

  test('that declares its use and process are the rows that apply, then its own', () => {
    expect(names({ use, process, cautions: () => [own] })).toEqual(['Silt'])
    expect(names({ use: { ...use, battery: 'lithium' }, process, cautions: () => [own] })).toEqual([
      'Lithium cells',
      'Silt',
    ])
    // How it is made is not declared without a process.
    expect(names({ use })).toEqual(['Uncured resins', 'Printing and cutting fumes', 'Sharp edges and chips'])
  })

  test('may depend on the genome', () => {
    const depending = (given: { readonly x?: Float64Array }) => ({ ...use, rotationHz: given.x![0]! })
    expect(names({ use: depending as never, process })).toEqual(['Rotating parts'])
  })

  test('take the mass from the listed parts where the use does not say it', () => {
    const { massKg: _, ...rest } = use
    const problem = { use: rest, process, parts: () => ({ massKg: 20 }) }
    expect(cautionsOf(problem, genome)[0]!.because).toMatch(/the machine is 20 kg/)
  })

  test('of what is no machine are its own only', () => {
    expect(names({ use: noMachine })).toEqual([])
  })

  test('are all rows with the reason when the declaration throws or is none', () => {
    const broken: readonly (() => unknown)[] = [
      () => {
        throw new Error('no such pad.')
      },
      () => ({ gasPressurePa: -1 }),
      () => undefined,
    ]
    const reasons = broken.map((one) => {
      const all = cautionsOf({ use: one as () => Use }, genome)
      expect(all.map(({ hazard }) => hazard)).toEqual(['Use not declared', ...everything])
      return all[0]!.because
    })
    expect(reasons[0]).toMatch(/every hazard of the table is listed: no such pad$/)
    expect(reasons[1]).toMatch(/use.gasPressurePa: found -1/)
  })

  test('are not lost when its own list or its parts throw', () => {
    const fail = () => {
      throw new Error('no list')
    }
    const { massKg: _, ...rest } = use
    const all = cautionsOf({ use: rest, process, parts: fail, cautions: fail }, genome)
    expect(all.map(({ hazard }) => hazard)).toEqual(['Lifting by hand', 'Use not declared'])
    expect(all[1]!.because).toMatch(/no list/)
  })

  test('the sentence under every machine asks for a slow first run, nobody in reach, and defers to codes', () => {
    for (const words of [
      'no certificate',
      'first at reduced amplitude',
      'nobody in reach',
      'local codes',
      'data sheets',
      'licensed practice',
    ]) {
      expect(alwaysCaution).toContain(words)
    }
  })
})
