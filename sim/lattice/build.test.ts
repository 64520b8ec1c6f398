import { describe, expect, test } from 'vitest'
import { Refusal } from '../../shared/refusals.js'
import { groundHeightM } from './advance.js'
import { buildLattice } from './build.js'
import type { LatticeSpec } from './spec.js'

const sound: LatticeSpec = {
  nodes: [
    { positionM: [0, 0], massKg: 1 },
    { positionM: [1, 0], massKg: 1 },
  ],
  struts: [{ a: 0, b: 1, stiffnessNpm: 100, dampingNspm: 1 }],
  actuators: [{ a: 0, b: 1, stiffnessNpm: 10, dampingNspm: 0, group: 0, strain: 0.1, phaseTurns: 0 }],
  groups: [{ frequencyHz: 1 }],
  gravityMps2: [0, -9.81],
  ground: { firstXM: 0, spacingM: 0.5, heightsM: [0, 0.1, 0.3] },
  contact: { stiffness: 1000, damping: 100, exponent: 1, depthLimitM: 0.01 },
  stepSeconds: 1e-3,
}
const strut = sound.struts[0]!
const active = sound.actuators![0]!

describe('a lattice that cannot be is refused, and the field named', () => {
  const rows: readonly (readonly [string, Partial<LatticeSpec>, string])[] = [
    ['no nodes', { nodes: [], struts: [], actuators: [] }, 'nodes'],
    [
      'a place that is no number',
      { nodes: [{ positionM: [0, Number.NaN], massKg: 1 }] },
      'nodes[0].positionM',
    ],
    ['one coordinate too many', { nodes: [{ positionM: [0, 0, 0], massKg: 1 }] }, 'nodes[0].positionM'],
    ['no mass', { nodes: [{ positionM: [0, 0], massKg: 0 }] }, 'nodes[0].massKg'],
    ['a strut to nowhere', { struts: [{ ...strut, b: 2 }] }, 'struts[0].b'],
    ['a strut to itself', { struts: [{ ...strut, b: 0 }] }, 'struts[0]'],
    ['a negative stiffness', { struts: [{ ...strut, stiffnessNpm: -1 }] }, 'struts[0].stiffnessNpm'],
    ['a strut without rest length', { struts: [{ ...strut, restM: 0 }] }, 'struts[0].restM'],
    ['an unknown group', { actuators: [{ ...active, group: 1 }] }, 'actuators[0].group'],
    ['a strain of 1', { actuators: [{ ...active, strain: 1 }] }, 'actuators[0].strain'],
    [
      'a path of an unknown node',
      { prescribed: [{ node: 9, group: 0, amplitudeM: [0, 0], phaseTurns: 0 }] },
      'prescribed[0].node',
    ],
    ['ground of one height', { ground: { firstXM: 0, spacingM: 1, heightsM: [0] } }, 'ground.heightsM'],
    ['contact without stiffness', { contact: { ...sound.contact!, stiffness: 0 } }, 'contact.stiffness'],
    ['a step too long', { stepSeconds: 0.1 }, 'stepSeconds'],
  ]
  test.each(rows)('%s', (_, change, field) => {
    let caught: unknown
    try {
      buildLattice({ ...sound, ...change })
    } catch (error) {
      caught = error
    }
    expect(caught).toBeInstanceOf(Refusal)
    expect((caught as Refusal).where?.field).toBe(`lattice.${field}`)
  })
})

test('ground is straight between its heights and level beyond them', () => {
  const lattice = buildLattice(sound)
  const heights = [-3, 0, 0.25, 0.5, 0.75, 1, 7].map((x) => groundHeightM(lattice, x))
  for (const [i, height] of [0, 0, 0.05, 0.1, 0.2, 0.3, 0.3].entries()) {
    expect(heights[i]).toBeCloseTo(height, 12)
  }
})

test('a rest length that is not given is the distance at the start', () => {
  expect(buildLattice(sound).restM[0]).toBe(1)
})
