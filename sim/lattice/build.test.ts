import { describe, expect, test } from 'vitest'
import { limits } from '../../shared/limits.js'
import { Refusal } from '../../shared/refusals.js'
import { buildLattice } from './build.js'
import { groundHeightM } from './ground.js'
import type { LatticeSpec } from './spec.js'
import { stepBound, stepSafety } from './stability.js'

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
const { group: _, ...guided } = active
const inSpace: Partial<LatticeSpec> = {
  dimensions: 3,
  nodes: [0, 1, 2, 3].map((i) => ({ positionM: [i % 2, i >> 1, i === 3 ? 1 : 0], massKg: 1 })),
  gravityMps2: [0, 0, 0],
}
const flying = { ground: undefined, contact: undefined } as unknown as Partial<LatticeSpec>

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
    ['a step that is no number', { stepSeconds: Number.NaN }, 'stepSeconds'],
    ['four dimensions', { dimensions: 4 as 3 }, 'dimensions'],
    [
      'more nodes than allowed',
      { nodes: new Array(limits.latticeNodesMost + 1).fill(sound.nodes[0]!) },
      'nodes',
    ],
    ['a negative mass', { nodes: [sound.nodes[0]!, { positionM: [1, 0], massKg: -1 }] }, 'nodes[1].massKg'],
    ['a mass that is no number', { nodes: [{ positionM: [0, 0], massKg: Number.NaN }] }, 'nodes[0].massKg'],
    [
      'a speed that is no number',
      { nodes: [{ positionM: [0, 0], velocityMps: [Number.NaN, 0], massKg: 1 }] },
      'nodes[0].velocityMps',
    ],
    [
      'negative friction',
      { nodes: [{ ...sound.nodes[0]!, friction: { forward: -0.1, backward: 0 } }] },
      'nodes[0].friction',
    ],
    ['a heading of its own', { nodes: [{ ...sound.nodes[0]!, headingNode: 0 }] }, 'nodes[0].headingNode'],
    ['a strut of no length', { nodes: [sound.nodes[0]!, { positionM: [0, 0], massKg: 1 }] }, 'struts[0]'],
    [
      'a stiffness that is no number',
      { actuators: [{ ...active, stiffnessNpm: Number.NaN }] },
      'actuators[0].stiffnessNpm',
    ],
    ['a negative dashpot', { struts: [{ ...strut, dampingNspm: -1 }] }, 'struts[0].dampingNspm'],
    ['a body in two parts', { nodes: [...sound.nodes, { positionM: [2, 0], massKg: 1 }] }, 'nodes[2]'],
    ['a force limit of 0', { actuators: [{ ...active, forceLimitN: 0 }] }, 'actuators[0].forceLimitN'],
    ['a strain limit of 1', { actuators: [{ ...active, strainLimit: 1 }] }, 'actuators[0].strainLimit'],
    [
      'a rate limit that is no number',
      { actuators: [{ ...active, strainRateLimitPerSecond: Number.NaN }] },
      'actuators[0].strainRateLimitPerSecond',
    ],
    ['a power limit of 0', { actuators: [{ ...active, powerLimitW: 0 }] }, 'actuators[0].powerLimitW'],
    ['guided by an unknown group', { guided: [{ ...active, group: 3 }] }, 'guided[0].group'],
    ['a power limit below 0', { guided: [{ ...guided, powerLimitW: -1 }] }, 'guided[0].powerLimitW'],
    [
      'feedback from an unknown sensor',
      { guided: [{ ...guided, feedback: [{ sensor: 0, gain: 1 }] }] },
      'guided[0].feedback[0].sensor',
    ],
    ['a sensor on an unknown node', { sensors: [{ kind: 'contact', node: 2 }] }, 'sensors[0].node'],
    ['a sensor on an unknown strut', { sensors: [{ kind: 'strain', strut: 2 }] }, 'sensors[0].strut'],
    [
      'a drag strut with a coefficient below 0',
      { dragStruts: [{ a: 0, b: 1, normalNspm2: 1, tangentNspm2: -1 }] },
      'dragStruts[0].tangentNspm2',
    ],
    [
      'a keep-apart pair without a distance',
      { keepApart: [{ a: 0, b: 1, leastM: 0, stiffnessNpm: 1 }] },
      'keepApart[0].leastM',
    ],
    [
      'an area the wrong way round',
      {
        nodes: [...sound.nodes, { positionM: [0, 1], massKg: 1 }],
        areas: [{ nodes: [0, 2, 1], stiffnessNpm: 1 }],
      },
      'areas[0]',
    ],
    ['a volume in the plane', { volumes: [{ nodes: [0, 1, 0, 1], stiffnessPa: 1 }] }, 'volumes'],
    [
      'a flat volume',
      {
        ...inSpace,
        ...flying,
        nodes: inSpace.nodes!.map(({ massKg, positionM: [x, y] }) => ({ massKg, positionM: [x!, y!, 0] })),
        volumes: [{ nodes: [0, 1, 2, 3], stiffnessPa: 1 }],
      },
      'volumes[0]',
    ],
    [
      'a sweep of no time',
      { groups: [{ frequencyHz: 1, sweep: { toHz: 2, seconds: 0 } }] },
      'groups[0].sweep.seconds',
    ],
    [
      'rows of heights in the plane',
      { ground: { ...sound.ground!, heightsM: [0, 0, 0, 0], rows: 2 } },
      'ground.rows',
    ],
    [
      'rows of unequal length',
      { ...inSpace, ground: { firstXM: 0, spacingM: 1, heightsM: [0, 0, 0], rows: 2 } },
      'ground.heightsM',
    ],
    ['ground without a contact law', { contact: undefined as never }, 'contact'],
    [
      'an automatic step with nothing to choose it by',
      { ...flying, struts: [], actuators: [], separateBodies: true, stepSeconds: 'auto' },
      'stepSeconds',
    ],
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

test('an automatic step is the stability bound times the safety factor', () => {
  expect(buildLattice({ ...sound, stepSeconds: 'auto' }).stepSeconds).toBe(
    stepSafety * stepBound(sound).limitSeconds,
  )
})

test('what hangs on held nodes does not fall apart; several bodies are taken where they are meant', () => {
  const far = [
    { positionM: [3, 0], massKg: 1 },
    { positionM: [4, 0], massKg: 1 },
  ]
  const two = { ...sound, nodes: [...sound.nodes, ...far], struts: [strut, { ...strut, a: 2, b: 3 }] }
  expect(() => buildLattice(two)).toThrow(/no way along struts from node 2 to node 0/)
  expect(() => buildLattice({ ...two, separateBodies: true })).not.toThrow()
  const hung = two.nodes.map((node, i) => ({ ...node, pinned: i % 2 === 0 }))
  expect(() => buildLattice({ ...two, nodes: hung })).not.toThrow()
})
