// The WebAssembly kernel against the reference in plain TypeScript: every lane gives the bits of advance() on the same
// lattice, in the plane and in space, with every law at work, whatever lies in the other lanes.

import { describe, expect, test } from 'vitest'
import { stream } from '../../shared/streams.js'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice } from '../../sim/lattice/build.js'
import {
  advanceLanes,
  type Lanes,
  lanePlaceM,
  lanePlaces,
  laneStrutBeyond,
  laneTally,
  packLanes,
  sampleLanes,
  unpackLane,
} from '../../sim/lattice/lanes.js'
import type { Lattice } from '../../sim/lattice/layout.js'
import { latticePlaces } from '../../sim/lattice/places.js'
import type { ActuatorLimits, LatticeSpec } from '../../sim/lattice/spec.js'
import { newTally, strutBeyond, takeSample } from '../../sim/lattice/tally.js'
import { varyLattice } from '../../sim/lattice/vary.js'
import { randomBody, randomVariation } from './lattice-bodies.js'

const seed = 20_261_201
const stateFields = [
  'nodes', 'touching', 'sensed', 'guidedStrain', 'rotors', 'rotation', 'driven',
] as const // biome-ignore format: one glance

const noNumber = new BigUint64Array(Float64Array.of(Number.NaN).buffer)[0]!

/** All of a lattice's state as bits. Which of its many patterns a NaN has is the host's affair (WebAssembly, numerics). */
function bitsOf(lattice: Lattice): string[] {
  const words = stateFields.map((field) => {
    const values = lattice[field]
    const bits = new BigUint64Array(values.slice().buffer)
    return `${field} ${Array.from(bits, (one, i) => (Number.isNaN(values[i]) ? noNumber : one).toString(16)).join(' ')}`
  })
  return [...words, `step ${lattice.step}`]
}

/** `count` situations of random body number `number`. */
function situations(number: number, dimensions: 2 | 3, count: number, parts: boolean): () => Lattice[] {
  const draw = stream(seed, 'spare', number, dimensions)
  const spec = randomBody(draw, dimensions)
  const body = buildLattice(spec)
  const variations = Array.from({ length: count }, () => randomVariation(draw, spec, parts))
  return () => variations.map((variation) => varyLattice(body, variation))
}

describe.each([2, 3] as const)('in %i dimensions', (dimensions) => {
  test.each([1, 2, 3, 4])('%i lanes give the bits of the reference over 1,300 steps', (count) => {
    for (const parts of [false, true]) {
      for (let number = 0; number < 6; number++) {
        const make = situations(10 * count + number, dimensions, count, parts)
        const alone = make()
        const lanes = packLanes(make())
        for (const steps of [1, 7, 100, 64, 500, 628]) {
          const expected = alone.map((lattice) => advance(lattice, steps))
          expect(advanceLanes(lanes, steps)).toEqual(expected)
          for (const [i, lattice] of alone.entries()) {
            expect(bitsOf(unpackLane(lanes, i)), `body ${number}, lane ${i}`).toEqual(bitsOf(lattice))
          }
        }
      }
    }
  })

  test('a lane has the same bits whatever lies beside it, and when many sets take turns', () => {
    const make = situations(77, dimensions, 4, false)
    const together = packLanes(make())
    const [a, b, c, d] = make() as [Lattice, Lattice, Lattice, Lattice]
    const packings = [packLanes([d, a]), packLanes([b]), packLanes([c, make()[0]!, make()[1]!])]
    for (let turn = 0; turn < 12; turn++) {
      for (const lanes of [together, ...packings]) advanceLanes(lanes, 97)
    }
    const expected = [0, 1, 2, 3].map((i) => bitsOf(unpackLane(together, i)))
    unpackLane(packings[0]!, 0)
    unpackLane(packings[0]!, 1)
    unpackLane(packings[1]!, 0)
    unpackLane(packings[2]!, 0)
    expect([a, b, c, d].map(bitsOf)).toEqual(expected)
    expect(new Set(expected.map(String)).size).toBe(4)
  })

  test('lanes of different parts have the bits of the reference beside equal ones', () => {
    const alike = situations(5, dimensions, 2, false)
    const [first] = alike() as [Lattice]
    const struts = first.stiffnessNpm.length
    const other = () => varyLattice(first, { strutFactors: new Array<number>(struts).fill(1.05) })
    const alone = [alike()[0]!, other(), alike()[1]!]
    const lanes = packLanes([alike()[0]!, other(), alike()[1]!])
    for (const lattice of alone) advance(lattice, 1000)
    advanceLanes(lanes, 1000)
    for (const [i, lattice] of alone.entries()) expect(bitsOf(unpackLane(lanes, i))).toEqual(bitsOf(lattice))
  })

  test('what the caller changes between calls is felt: drag, and strains wanted of guided struts', () => {
    const make = situations(6, dimensions, 3, false)
    const alone = make()
    const packed = make()
    const lanes = packLanes(packed)
    for (let turn = 0; turn < 10; turn++) {
      for (const [i, lattice] of [...alone, ...packed].entries()) {
        lattice.dragNspm = 0.01 * ((turn + i) % 3)
        lattice.hostStrain.fill(0.02 * ((turn % 4) - 1) * ((i % 3) + 1))
      }
      for (const lattice of alone) advance(lattice, 50)
      advanceLanes(lanes, 50)
    }
    for (const [i, lattice] of alone.entries()) expect(bitsOf(unpackLane(lanes, i))).toEqual(bitsOf(lattice))
  })

  test('samples are the bits of takeSample()', () => {
    const make = situations(8, dimensions, 3, true)
    const alone = make()
    const lanes = packLanes(make())
    const tallies = alone.map(newTally)
    for (let sample = 0; sample < 40; sample++) {
      for (const [i, lattice] of alone.entries()) {
        advance(lattice, 25)
        takeSample(lattice, tallies[i]!, 0.0025)
      }
      advanceLanes(lanes, 25)
      sampleLanes(lanes, 0.0025)
    }
    for (const [i, tally] of tallies.entries()) {
      expect(laneTally(lanes, i)).toEqual(tally)
      expect(lanePlaceM(lanes, i, 3, 1)).toBe(alone[i]!.nodes[3 * alone[i]!.stride + 1])
      expect(Math.max(...tally.workJ)).toBeGreaterThan(0)
      expect(Math.max(...tally.loadedSamples)).toBeGreaterThan(0)
      expect(Math.max(...tally.contacts)).toBeGreaterThan(0)
    }
  })

  test('samples on the way are those of calls between samples, and places are where the nodes are', () => {
    const make = situations(8, dimensions, 3, true)
    const alone = make()
    const tallies = alone.map(newTally)
    const lanes = packLanes(make())
    for (const steps of [300, 210]) {
      for (const [i, lattice] of alone.entries()) {
        const seconds = 30 * lattice.stepSeconds
        const take = () => takeSample(lattice, tallies[i]!, seconds)
        expect(advance(lattice, steps, { everySteps: 30, take })).toBeUndefined()
      }
      expect(advanceLanes(lanes, steps, 30)).toEqual([undefined, undefined, undefined])
    }
    for (const [i, lattice] of alone.entries()) {
      expect(tallies[i]!.samples).toBe(17)
      expect(laneTally(lanes, i)).toEqual(tallies[i])
      const { numbers, first, nodeStep, axisStep } = lanePlaces(lanes, i)
      const here = latticePlaces(lattice)
      for (let node = 0; node < lattice.nodeCount; node++) {
        for (let axis = 0; axis < dimensions; axis++) {
          const there = numbers[first + node * nodeStep + axis * axisStep]
          expect(there).toBe(here.numbers[here.first + node * here.nodeStep + axis * here.axisStep])
        }
      }
    }
  })

  test('the first strut beyond its bounds is found in the samples of a lane as in a tally', () => {
    const make = situations(8, dimensions, 2, false)
    const [lattice] = make() as [Lattice]
    const tally = newTally(lattice)
    advance(lattice, 200, { everySteps: 20, take: () => takeSample(lattice, tally, 0.002) })
    const lanes = packLanes(make())
    advanceLanes(lanes, 200, 20)
    const { shortestM, longestM } = tally
    const found = (leastM: Float64Array, mostM: Float64Array) => {
      expect(laneStrutBeyond(lanes, 0, leastM, mostM)).toBe(strutBeyond(tally, leastM, mostM))
      return strutBeyond(tally, leastM, mostM)
    }
    expect(found(shortestM, longestM)).toBe(-1)
    for (const strut of [0, 3, shortestM.length - 1]) {
      expect(found(shortestM.with(strut, 1.0001 * shortestM[strut]!), longestM)).toBe(strut)
      expect(found(shortestM, longestM.with(strut, 0.9999 * longestM[strut]!))).toBe(strut)
    }
  })

  test('a fault stops its own lane with the reason and time of the reference; the others go on', () => {
    const make = situations(9, dimensions, 4, false)
    // One that may hardly sink into the ground, and one with a speed that is no number.
    const spoil = ([a, b, c, d]: Lattice[]) => {
      const strange = { ...c!, nodes: c!.nodes.slice() }
      const free = strange.inverseMass.findIndex((m) => m > 0)
      strange.nodes[free * strange.stride + dimensions] = Number.NaN
      return [a!, { ...b!, depthLimitM: 1e-5 }, strange, d!]
    }
    const alone = spoil(make())
    const lanes = packLanes(spoil(make()))
    const expected = alone.map(() => undefined) as (ReturnType<typeof advance> | undefined)[]
    for (let call = 0; call < 8; call++) {
      for (const [i, lattice] of alone.entries()) expected[i] ??= advance(lattice, 100)
      expect(advanceLanes(lanes, 100)).toEqual(expected)
    }
    expect(expected.map((fault) => fault?.reason.replace(/[0-9.]+/g, '#'))).toEqual([
      undefined,
      'node # sank # mm into the ground',
      'node # has no finite position or speed',
      undefined,
    ])
    for (const [i, lattice] of alone.entries()) expect(bitsOf(unpackLane(lanes, i))).toEqual(bitsOf(lattice))
  })
})

const unlimitedPower = <Strut extends ActuatorLimits>(strut: Strut): Strut => {
  return { ...strut, powerLimitW: Number.POSITIVE_INFINITY }
}

// Without these the tests above could pass with a law that nobody computes.
describe.each([2, 3] as const)('every law counts in the random bodies in %i dimensions', (dimensions) => {
  const changes: readonly (readonly [string, (spec: LatticeSpec) => LatticeSpec])[] = [
    [
      'active struts',
      (spec) => ({ ...spec, actuators: spec.actuators!.map((one) => ({ ...one, strain: 0 })) }),
    ],
    ['feedback', (spec) => ({ ...spec, guided: spec.guided!.map(({ feedback: _, ...one }) => one) })],
    ['power limits', (spec) => ({ ...spec, guided: spec.guided!.map(unlimitedPower) })],
    [
      'power limits of active struts',
      (spec) => ({ ...spec, actuators: spec.actuators!.map(unlimitedPower) }),
    ],
    ['drag struts', (spec) => ({ ...spec, dragStruts: [] })],
    ['areas and volumes', (spec) => ({ ...spec, areas: [], volumes: [] })],
    ['pairs kept apart', (spec) => ({ ...spec, keepApart: [] })],
    ['friction', (spec) => ({ ...spec, nodes: spec.nodes.map(({ friction: _, ...one }) => one) })],
    ['sweeps', (spec) => ({ ...spec, groups: spec.groups!.map(({ sweep: _, ...one }) => one) })],
    ['ground', ({ ground: _, ...spec }) => spec],
  ]
  test.each(changes)('%s', (_, change) => {
    const differs = Array.from({ length: 4 }, (_, number) => {
      const spec = randomBody(stream(seed, 'spare', 40 + number, dimensions), dimensions)
      const [full, less] = [spec, change(spec)].map((one) => packLanes([buildLattice(one)])) as [Lanes, Lanes]
      for (const lanes of [full, less]) advanceLanes(lanes, 1000)
      const [a, b] = [unpackLane(full, 0), unpackLane(less, 0)]
      return a.nodes.some((value, i) => value !== b.nodes[i])
    })
    expect(differs).toContain(true)
  })
})

describe('lattices that cannot go side by side are refused, and the field named', () => {
  const make = situations(3, 2, 4, false)
  const refused = (lattices: readonly Lattice[]) => {
    try {
      packLanes(lattices)
      return 'packed'
    } catch (error) {
      return (error as { where?: { field?: string } }).where?.field
    }
  }
  test.each([
    ['none', () => [], 'lattices'],
    ['five', () => [...make(), make()[0]!], 'lattices'],
    ['another body', () => [make()[0]!, situations(4, 2, 1, false)()[0]!], 'lattices[1].nodeCount'],
    ['another time', () => [make()[0]!, { ...make()[1]!, step: 7 }], 'lattices[1].step'],
    ['another step', () => [make()[0]!, { ...make()[1]!, stepSeconds: 5e-5 }], 'lattices[1].stepSeconds'],
    [
      'other ends',
      () => [make()[0]!, { ...make()[1]!, ends: make()[1]!.ends.toReversed() }],
      'lattices[1].ends',
    ],
  ] as const)('%s', (_, lattices, field) => {
    expect(refused(lattices())).toBe(field)
  })
})
