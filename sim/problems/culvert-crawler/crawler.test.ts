// Promises of the culvert crawler: buildable, honest, repeatable. How well it can be evolved is a matter of the bench.

import { describe, expect, test } from 'vitest'
import { conditionStream } from '../../../shared/conditions.js'
import { checkGenome, genomesEqual, randomGenome } from '../../../shared/encodings.js'
import { cautionsOf } from '../../../shared/making/cautions.js'
import { makingFaults } from '../../../shared/making/makeability.js'
import type { AnyProblem } from '../../../shared/problem.js'
import { stream } from '../../../shared/streams.js'
import { advance } from '../../lattice/advance.js'
import { type Lattice, planeStride as stride } from '../../lattice/layout.js'
import { contactJ, elasticJ, gravitationalJ, kineticJ } from '../../lattice/observe.js'
import { stepBound, stepSafety } from '../../lattice/stability.js'
import { strutBeyond } from '../../lattice/tally.js'
import { buildBody } from './body.js'
import { strutFault, watchOf } from './collapse.js'
import { type CulvertCondition, culvert, culvertGround, drawCulvert, slopeMost } from './floor.js'
import { actuator, type CrawlerGenome, feet, none } from './genome.js'
import problem from './index.js'
import type { Machine } from './machine.js'
import { outcomeOf } from './measure.js'
import { numbers } from './numbers.js'
import { baseLattice, describeMachine, followTrial, framesPerTrial, situate } from './trial.js'

function founder(number: number): CrawlerGenome {
  return problem.repair(
    randomGenome(problem.genome, stream(20_261_201, 'founder', 1, number)) as CrawlerGenome,
  )
}
const condition = (replicate: number) => drawCulvert(conditionStream(20_261_201, true, 1, replicate))
/** The body about to settle, on the reference simulator. */
function settling(machine: Machine, surroundings: CulvertCondition): Lattice {
  return situate(baseLattice(machine, culvert.steepest), machine, culvert, [surroundings])[0]!
}
const situation = (replicate: number) => ({ condition: condition(replicate), case: '' })

/** Three bays, all soft, one chain of actuators below, pads that let go forwards. */
function inchworm(amplitude: number): CrawlerGenome {
  const genome = founder(1)
  const struts = new Int32Array(genome.struts.length)
  for (let column = 0; column < 9; column++) {
    struts[5 * column + 1] = actuator
    struts[5 * column + 3] = 1
  }
  return {
    ...genome,
    bays: Int32Array.of(3),
    bayLength: genome.bayLength.map(() => 0.06),
    height: genome.height.map(() => 0.05),
    struts,
    group: new Int32Array(struts.length),
    foot: genome.foot.map(() => feet.indexOf('pad')),
    amplitude: genome.amplitude.map(() => amplitude),
    frequency: Float64Array.of(1),
  }
}

function distanceOf(genome: CrawlerGenome, replicate: number): number {
  const outcome = problem.simulate(genome, [situation(replicate)])[0]!
  return 'failed' in outcome ? Number.NaN : outcome.objectives.distance!
}

describe('the genome', () => {
  test('repair leaves a genome that fits, is idempotent and keeps every bay braced', () => {
    for (let i = 0; i < 50; i++) {
      const genome = founder(i)
      expect(checkGenome(problem.genome, genome)).toBeUndefined()
      expect(genomesEqual(problem.genome, problem.repair(genome), genome)).toBe(true)
      for (let slot = 0; slot < genome.struts.length; slot += 5) {
        expect(Array.from(genome.struts.subarray(slot, slot + 3))).not.toContain(none)
        expect(Math.min(genome.struts[slot + 3]!, genome.struts[slot + 4]!)).toBeLessThan(none)
      }
    }
  })

  test('masses add up, and the rate of strain is limited', () => {
    for (let i = 0; i < 20; i++) {
      const body = buildBody(founder(i))
      const sum = body.nodeMassesKg.reduce((a, b) => a + b, 0)
      expect(sum).toBeCloseTo(body.massKg, 12)
      expect(body.massKg).toBeCloseTo(body.materialKg + numbers.puckKg, 12)
      for (const strain of body.strains) {
        expect(2 * Math.PI * body.frequencyHz * strain).toBeLessThanOrEqual(
          numbers.strainRateMost * (1 + 1e-12),
        )
        expect(strain).toBeLessThanOrEqual(numbers.strainMost)
      }
    }
  })
})

describe('the floor', () => {
  test('no debris is steeper than what the step is chosen for', () => {
    for (let j = 0; j < 50; j++) {
      const { heightsM, spacingM } = culvertGround(condition(j).debris)
      for (let i = 1; i < heightsM.length; i++) {
        expect(Math.abs(heightsM[i]! - heightsM[i - 1]!) / spacingM).toBeLessThanOrEqual(slopeMost)
      }
    }
  })

  test('the body stands on smooth floor at first', () => {
    const { heightsM, spacingM, firstXM } = culvertGround(condition(3).debris)
    for (let i = 0; firstXM + i * spacingM <= 0; i++) expect(heightsM[i]).toBe(0)
  })
})

describe('a trial', () => {
  test('every body gets a safe step', () => {
    for (let i = 0; i < 30; i++) {
      const spec = describeMachine(buildBody(founder(i)), culvert.steepest)
      const { limitSeconds } = stepBound(spec)
      expect(spec.stepSeconds).toBeLessThanOrEqual(stepSafety * limitSeconds * (1 + 1e-9))
    }
  })

  test('a body without stroke stays where it settled and only loses energy', () => {
    const machine = buildBody(inchworm(0))
    const lattice = settling(machine, condition(0))
    const energy = () => kineticJ(lattice) + elasticJ(lattice) + gravitationalJ(lattice) + contactJ(lattice)
    let last = Number.POSITIVE_INFINITY
    let first: Float64Array | undefined
    const result = followTrial(machine, lattice, () => {
      // 1e-6 J lifts the puck by 2 micrometres: the ripple of the scheme.
      expect(energy()).toBeLessThan(last + 1e-6)
      last = energy()
      first ??= lattice.nodes.slice()
    })
    expect(result).not.toHaveProperty('reason')
    for (let i = 0; i < lattice.nodeCount; i++) {
      expect(Math.abs(lattice.nodes[i * stride]! - first![i * stride]!)).toBeLessThan(1e-3)
    }
  })

  test('it has settled when it starts', () => {
    for (let i = 0; i < 20; i++) {
      const machine = buildBody(founder(i))
      const lattice = settling(machine, condition(i))
      if (advance(lattice, lattice.driveStartStep)) continue
      // As much as the whole body at 2 cm/s.
      expect(kineticJ(lattice)).toBeLessThan(0.5 * machine.massKg * 0.02 * 0.02)
    }
  })

  test('the lanes of the kernel give the bits of the reference, however many go side by side', () => {
    let failed = 0
    for (let i = 0; i < 8; i++) {
      const machine = buildBody(founder(i))
      const truth = [0, 1, 2, 3, 4].map((j) =>
        outcomeOf(machine, followTrial(machine, settling(machine, condition(j)))),
      )
      if (truth.some((outcome) => 'failed' in outcome)) failed++
      for (const count of [1, 2, 3, 5]) {
        const situations = Array.from({ length: count }, (_, j) => situation(j))
        expect(problem.simulate(founder(i), situations)).toEqual(truth.slice(0, count))
      }
    }
    expect(failed).toBeLessThan(8)
  })

  test('pads decide the way: an inchworm goes forwards, and backwards on reversed pads', () => {
    const genome = inchworm(0.15)
    const reversed = { ...genome, foot: genome.foot.map(() => feet.indexOf('pad-reversed')) }
    // Smooth floor, so that only the pads differ.
    const smooth = { condition: { floorFriction: 0.6, lagSeconds: 0.03, debris: [] }, case: '' }
    const way = (g: CrawlerGenome) => {
      const outcome = problem.simulate(g, [smooth])[0]!
      return 'failed' in outcome ? Number.NaN : outcome.objectives.distance!
    }
    expect(way(genome)).toBeGreaterThan(0.02)
    expect(way(reversed)).toBeLessThan(-0.02)
  })

  test('half the step gives the same distance within 2 %', () => {
    const genome = inchworm(0.15)
    const run = (divide: number) => {
      const [outcome] = problem.simulateFiner!(genome, [situation(2)], divide)
      return 'failed' in outcome! ? Number.NaN : outcome!.objectives.distance!
    }
    const whole = run(1)
    expect(whole).toBeGreaterThan(0.02)
    expect(Math.abs(run(2) / whole - 1)).toBeLessThan(0.02)
  })

  test('the same twice, to the bit, whatever was simulated between', () => {
    const genome = founder(4)
    const once = problem.simulate(genome, [situation(0), situation(1)])
    problem.simulate(founder(5), [situation(1)])
    expect(problem.simulate(genome, [situation(1), situation(0)])).toEqual([once[1], once[0]])
  })

  test('a broken body fails with a reason and a time', () => {
    const machine = buildBody(inchworm(0.15))
    const broken = (alter: (nodes: Float64Array) => void, atFrame: number) => {
      const lattice = settling(machine, condition(0))
      let frame = 0
      const result = followTrial(machine, lattice, () => {
        if (frame++ === atFrame) alter(lattice.nodes)
      })
      return 'reason' in result ? result : undefined
    }
    expect(broken(() => {}, 0)).toBeUndefined()
    // The upper node of column 1 thrown far ahead; a node without a place.
    const thrown = broken((nodes) => nodes.set([0.5, 0.3, 0, 0], stride), 0)
    expect(thrown?.reason).toMatch(/collapsed|was at \d+ % of its length/)
    const fault = broken((nodes) => nodes.set([Number.NaN], stride), 0)
    expect(fault?.reason).toMatch(/no finite position/)
    // Looked at every 64 steps of at most 1 ms.
    expect(fault?.seconds).toBeGreaterThan(numbers.settleSeconds)
    expect(fault?.seconds).toBeLessThan(numbers.settleSeconds + 0.065)
  })

  test('a strut that is torn only between two looks is found in the samples', () => {
    const machine = buildBody(inchworm(0.15))
    const lattice = settling(machine, condition(0))
    const result = followTrial(machine, lattice)
    if ('reason' in result) throw new Error(result.reason)
    const watch = watchOf(machine)
    const { tally } = result
    const found = () => {
      const strut = strutBeyond(tally, watch.leastM, watch.mostM)
      return strut < 0 ? undefined : strutFault(watch, strut, tally, 1).reason
    }
    expect(found()).toBeUndefined()
    const { lengthM, place } = machine.members[2]!
    tally.longestM[2] = 1.51 * lengthM
    expect(found()).toMatch(new RegExp(`${place}.* was at 151 %`))
    tally.longestM[2] = lengthM
    tally.shortestM[2] = 0.59 * lengthM
    expect(found()).toMatch(/was at 59 %/)
  })

  test('random bodies hardly move', () => {
    const distances = Array.from({ length: 40 }, (_, i) => Math.abs(distanceOf(founder(i), 0))).sort(
      (a, b) => a - b,
    )
    expect(distances[20]).toBeLessThan(0.03)
  })
})

describe('what is told of a machine', () => {
  test('frames run from the settled body to the end, 25 a second, and end where the distance says', () => {
    const genome = inchworm(0.15)
    const frames = problem.frames!(genome, situation(2))
    expect(frames.positions).toHaveLength(framesPerTrial + 1)
    expect(frames.secondsPerFrame).toBe(0.04)
    const puck = 2 * frames.markers[0]!.node
    const travelled = frames.positions.at(-1)![puck]! - frames.positions[0]![puck]!
    expect(travelled).toBeCloseTo(distanceOf(genome, 2), 12)
    expect(frames.drive).toHaveLength(3)
    for (const { values } of frames.drive) {
      expect(values).toHaveLength(framesPerTrial + 1)
      expect(values.every((value) => Math.abs(value) <= 1)).toBe(true)
    }
  })

  test('every part is described with units', () => {
    const genome = inchworm(0.15)
    const lines = problem.describe!(genome)
    const body = buildBody(genome)
    expect(lines.filter((line) => /lower|upper \d/.test(line) && /N\/m/.test(line))).toHaveLength(
      body.members.length,
    )
    expect(lines.join('\n')).toMatch(/Group 1: length \+-15\.0 %/)
  })

  test('cautions carry the numbers of this machine, and gas only where there is some', () => {
    const withAir = cautionsOf(problem as unknown as AnyProblem, inchworm(0.15))
    expect(withAir.find((row) => row.hazard === 'Compressed gas')?.because).toMatch(/up to 50 kPa gauge/)
    expect(withAir.find((row) => row.hazard === 'Pinching and crushing')?.because).toMatch(/up to 17 N/)
    for (const { consult, because } of withAir) {
      expect(consult.length).toBeGreaterThan(20)
      expect(because).not.toMatch(/not declared/)
    }
    const passive = { ...inchworm(0), struts: new Int32Array(45) }
    const names = cautionsOf(problem as unknown as AnyProblem, passive).map((row) => row.hazard)
    for (const gone of ['Compressed gas', 'Pinching and crushing']) expect(names).not.toContain(gone)
    for (const kept of ['Bad air in confined spaces', 'Stuck machine blocking the flow', 'Drinking water'])
      expect(names).toContain(kept)
  })

  test('every founder can be made, and one that is too long cannot', () => {
    for (let i = 0; i < 100; i++) {
      expect(makingFaults(problem.process!, problem.parts!(founder(i)))).toEqual([])
    }
    const parts = problem.parts!({
      ...founder(1),
      bays: Int32Array.of(8),
      bayLength: new Float64Array(8).fill(0.09),
    })
    expect(makingFaults(problem.process!, parts).map(({ rule }) => rule)).toEqual(['envelope'])
  })

  test('stiffness classes are rows of the workshop’s stock, and have not moved by a bit', () => {
    // Gent, 1958, to six digits: what recorded searches were run with.
    expect(numbers.youngPa).toEqual({ soft: 0.412683e6, firm: 0.731922e6, hard: 1.142372e6 })
    expect(numbers).toMatchObject({
      strainMost: 0.25,
      strainRateMost: 1.2,
      actuatorFittingKg: 0.004,
      rubberKgpm3: 1070,
    })
    expect(numbers.pressurePa * numbers.boreAreaM2).toBe(50e3 * (Math.PI * 0.006 * 0.006))
    expect(problem.process!.stock.map(({ areaM2 }) => areaM2)).toEqual(new Array(3).fill(numbers.strutAreaM2))
    expect(problem.process!.stock.map(({ material }) => material.youngPa)).toEqual(
      Object.values(numbers.youngPa),
    )
  })

  test('expected costs follow the work', () => {
    const small = problem.expectedCost(inchworm(0.1))
    const large = problem.expectedCost({ ...inchworm(0.1), bays: Int32Array.of(8) })
    expect(small).toBeGreaterThanOrEqual(1)
    expect(large).toBeGreaterThan(1.8 * small)
  })
})
