// The same body in another situation, and what is sampled while it moves.

import { describe, expect, test } from 'vitest'
import { actuatorFigures } from '../../shared/making/measures.js'
import { Refusal } from '../../shared/refusals.js'
import { advance } from './advance.js'
import { buildLattice } from './build.js'
import { lengthM, lengthRateMps, tensionN } from './observe.js'
import type { LatticeSpec } from './spec.js'
import { actuatorTally, newTally, takeSample } from './tally.js'
import { type Variation, varyLattice } from './vary.js'

const pad = { forward: 0.3, backward: 0.9 }
const spec: LatticeSpec = {
  nodes: [
    { positionM: [0, 0], massKg: 0.02, friction: pad },
    { positionM: [0.1, 0], massKg: 0.02, friction: pad },
    { positionM: [0.05, 0.1], massKg: 0.03 },
  ],
  struts: [
    { a: 0, b: 2, stiffnessNpm: 200, dampingNspm: 0.2 },
    { a: 1, b: 2, stiffnessNpm: 200, dampingNspm: 0.2 },
  ],
  actuators: [
    { a: 0, b: 1, stiffnessNpm: 200, dampingNspm: 0.2, group: 0, strain: 0.2, phaseTurns: 0, forceLimitN: 3 },
  ],
  guided: [
    {
      a: 0,
      b: 2,
      stiffnessNpm: 20,
      dampingNspm: 0.1,
      group: 1,
      strain: 0.1,
      phaseTurns: 0.2,
      powerLimitW: 0.01,
    },
  ],
  groups: [{ frequencyHz: 2, lagSeconds: 0.02 }, { frequencyHz: 3 }],
  gravityMps2: [0, -9.81],
  ground: { firstXM: -1, spacingM: 1, heightsM: [0, 0, 0.1] },
  contact: { stiffness: 2000, damping: 2000, exponent: 1, depthLimitM: 0.02 },
  stepSeconds: 2e-4,
}
const ground = { firstXM: -1, spacingM: 0.1, heightsM: Array.from({ length: 40 }, (_, i) => 0.002 * (i % 2)) }

describe('a varied lattice', () => {
  const rows: readonly (readonly [string, Variation, LatticeSpec])[] = [
    ['nothing', {}, spec],
    ['ground', { ground }, { ...spec, ground }],
    [
      'friction',
      { friction: [{ forward: 0.1, backward: 0.2 }, undefined, pad] },
      {
        ...spec,
        nodes: [
          { ...spec.nodes[0]!, friction: { forward: 0.1, backward: 0.2 } },
          { positionM: [0.1, 0], massKg: 0.02 },
          { ...spec.nodes[2]!, friction: pad },
        ],
      },
    ],
    [
      'lag',
      { lagSeconds: 0.07 },
      { ...spec, groups: spec.groups!.map((group) => ({ ...group, lagSeconds: 0.07 })) },
    ],
    [
      'phases',
      { phaseTurns: [0.25, 0.5] },
      {
        ...spec,
        actuators: [{ ...spec.actuators![0]!, phaseTurns: 0.25 }],
        guided: [{ ...spec.guided![0]!, phaseTurns: 0.5 }],
      },
    ],
    ['drag', { dragNspm: 0.1 }, { ...spec, dragNspm: 0.1 }],
  ]

  test.each(rows)(
    '%s: the same bits as built that way, and what does not differ is shared',
    (_, variation, truth) => {
      const first = buildLattice(spec)
      advance(first, 777)
      const varied = varyLattice(first, variation)
      const built = buildLattice(truth)
      expect(varied.stiffnessNpm).toBe(first.stiffnessNpm)
      expect(varied.ends).toBe(first.ends)
      expect(varied.rotation).toBe(first.rotation)
      expect(varied.heightsM === first.heightsM).toBe(variation.ground === undefined)
      expect(varied.nodes).not.toBe(first.nodes)
      expect(varied.step).toBe(0)
      advance(varied, 3_000)
      advance(built, 3_000)
      expect(varied.nodes).toEqual(built.nodes)
      expect(varied.driven).toEqual(built.driven)
    },
  )

  test('scattered parts: stiffness and damping by a factor each', () => {
    const factors = [1.1, 0.9, 1.05, 0.8]
    const varied = varyLattice(buildLattice(spec), { strutFactors: factors })
    expect(Array.from(varied.stiffnessNpm, (k) => k.toPrecision(12))).toEqual(
      [220, 180, 210, 16].map((k) => k.toPrecision(12)),
    )
    expect(varied.dampingNspm[3]).toBeCloseTo(0.08, 14)
    expect(varied.stiffnessRestN[2]! / varied.restM[2]!).toBeCloseTo(210, 10)
  })

  test('of a varied one stays as varied', () => {
    const once = varyLattice(buildLattice(spec), { strutFactors: [2, 2, 2, 2] })
    const twice = varyLattice(once, { dragNspm: 0.2 })
    expect(twice.stiffnessNpm).toBe(once.stiffnessNpm)
    expect(twice.dragNspm).toBe(0.2)
  })

  const wrong: readonly (readonly [string, Variation, string])[] = [
    ['too few coefficients', { friction: [pad] }, 'friction'],
    ['negative friction', { friction: [undefined, { forward: -1, backward: 0 }, pad] }, 'nodes[1].friction'],
    ['a lag that is no number', { lagSeconds: Number.NaN }, 'lagSeconds'],
    ['too many phases', { phaseTurns: [0, 0, 0] }, 'phaseTurns'],
    ['a phase that is no number', { phaseTurns: [0, Number.NaN] }, 'phaseTurns[1]'],
    ['a factor of 0', { strutFactors: [1, 1, 0, 1] }, 'strutFactors[2]'],
    ['negative drag', { dragNspm: -1 }, 'dragNspm'],
    [
      'a height that is no number',
      { ground: { ...ground, heightsM: [0, Number.NaN] } },
      'ground.heightsM[1]',
    ],
    ['parts too stiff for the step', { strutFactors: [1, 5e4, 1, 1] }, 'stepSeconds'],
    ['a cliff too steep for the step', { ground: { ...ground, heightsM: [0, 30] } }, 'stepSeconds'],
  ]
  test.each(wrong)('%s is refused, and the field named', (_, variation, field) => {
    let caught: unknown
    try {
      varyLattice(buildLattice(spec), variation)
    } catch (error) {
      caught = error
    }
    expect(caught).toBeInstanceOf(Refusal)
    expect((caught as Refusal).where?.field).toBe(`lattice.${field}`)
  })
})

test('a tally keeps what observe.* says, sample by sample', () => {
  const lattice = varyLattice(buildLattice(spec), { ground })
  const tally = newTally(lattice)
  const truth = {
    peak: [0, 0, 0, 0],
    work: [0, 0],
    loaded: [0, 0],
    shortest: [9, 9, 9, 9],
    contacts: [0, 0, 0],
    low: 9,
    high: -9,
  }
  for (let sample = 0; sample < 200; sample++) {
    expect(advance(lattice, 25)).toBeUndefined()
    takeSample(lattice, tally, 25 * 2e-4)
    for (let i = 0; i < 4; i++) {
      const tension = tensionN(lattice, i)
      truth.peak[i] = Math.max(truth.peak[i]!, Math.abs(tension))
      truth.shortest[i] = Math.min(truth.shortest[i]!, lengthM(lattice, i))
      if (i < 2) continue
      truth.work[i - 2]! += Math.max(0, -tension * lengthRateMps(lattice, i)) * 25 * 2e-4
      if (Math.abs(tension) > 0.1 * lattice.limitN[i - 2]!) truth.loaded[i - 2]!++
    }
    for (let i = 0; i < 3; i++) {
      const [x, y] = [lattice.nodes[6 * i]!, lattice.nodes[6 * i + 1]!]
      const cell = Math.floor((x + 1) / 0.1)
      const height = 0.002 * (cell % 2 === 0 ? (x + 1) / 0.1 - cell : 1 - (x + 1) / 0.1 + cell)
      if (y < height - 1e-9) truth.contacts[i]!++
    }
    truth.low = Math.min(truth.low, lattice.nodes[13]!)
    truth.high = Math.max(truth.high, lattice.nodes[13]!)
  }
  expect(tally.samples).toBe(200)
  for (let i = 0; i < 4; i++) {
    expect(tally.peakTensionN[i]).toBeCloseTo(truth.peak[i]!, 10)
    expect(tally.shortestM[i]).toBe(truth.shortest[i])
    expect(tally.longestM[i]).toBeGreaterThan(tally.shortestM[i]!)
  }
  for (let j = 0; j < 2; j++) expect(tally.workJ[j]).toBeCloseTo(truth.work[j]!, 12)
  expect(truth.work[0]).toBeGreaterThan(0)
  expect(Array.from(tally.loadedSamples)).toEqual(truth.loaded)
  // Neither never nor always under load.
  expect(truth.loaded[0]).toBeGreaterThan(0)
  expect(truth.loaded[0]).toBeLessThan(200)
  const { duty, peakForce, stroke } = actuatorFigures(actuatorTally(tally, 0), lattice.restM[2]!, 25 * 2e-4)
  expect(duty).toBe(truth.loaded[0]! / 200)
  expect(peakForce).toBe(tally.peakTensionN[2])
  expect(stroke).toBe((tally.longestM[2]! - tally.shortestM[2]!) / lattice.restM[2]!)
  expect(Array.from(tally.contacts)).toEqual(truth.contacts)
  expect(truth.contacts[0]).toBeGreaterThan(20)
  expect([tally.lowestM[2], tally.highestM[2]]).toEqual([truth.low, truth.high])
})
