// Promises of the crawler on three chains: buildable, repeatable, the same bits in lanes and on the reference.

import { describe, expect, test } from 'vitest'
import { conditionStream } from '../../../shared/conditions.js'
import { checkGenome, genomesEqual, randomGenome } from '../../../shared/encodings.js'
import { stream } from '../../../shared/streams.js'
import { watchOf } from '../culvert-crawler/collapse.js'
import { actuator, feet, none } from '../culvert-crawler/genome.js'
import { outcomeOf } from '../culvert-crawler/measure.js'
import { numbers } from '../culvert-crawler/numbers.js'
import { baseLattice, followTrial, framesPerTrial, situate } from '../culvert-crawler/trial.js'
import { buildBody3d } from './body.js'
import { drawPipe, invertM, type PipeCondition, pipe, pipeGround } from './floor.js'
import { type Crawler3dGenome, places, placesPerColumn } from './genome.js'
import problem from './index.js'

function founder(number: number): Crawler3dGenome {
  return problem.repair(
    randomGenome(problem.genome, stream(20_261_201, 'founder', 1, number)) as Crawler3dGenome,
  )
}
const condition = (replicate: number) => drawPipe(conditionStream(20_261_201, true, 1, replicate))
const situation = (replicate: number) => ({ condition: condition(replicate), case: '' })
const clean: { condition: PipeCondition; case: string } = {
  condition: { floorFriction: 0.6, lagSeconds: 0.03, debris: [] },
  case: '',
}

/** Three equal bays, all soft; left and right chords drive; pads that let go forwards. */
function inchworm(amplitude: number, foot: (typeof feet)[number] = 'pad'): Crawler3dGenome {
  const genome = founder(1)
  const struts = new Int32Array(genome.struts.length)
  for (let first = 0; first < struts.length; first += placesPerColumn) {
    struts[first + places.findIndex(({ name }) => name === 'left chord')] = actuator
    struts[first + places.findIndex(({ name }) => name === 'right chord')] = actuator
    for (const place of [7, 8, 10]) struts[first + place] = none
  }
  return problem.repair({
    ...genome,
    bays: Int32Array.of(3),
    bayLength: genome.bayLength.map(() => 0.06),
    height: genome.height.map(() => 0.05),
    width: genome.width.map(() => 0.05),
    struts,
    group: new Int32Array(struts.length),
    foot: genome.foot.map(() => feet.indexOf(foot)),
    amplitude: genome.amplitude.map(() => amplitude),
    frequency: Float64Array.of(1),
  })
}
const distance = (genome: Crawler3dGenome, where: typeof clean) => {
  const [outcome] = problem.simulate(genome, [where])
  return 'failed' in outcome! ? Number.NaN : outcome!.objectives.distance!
}

test('repair leaves a genome that fits, is idempotent, and every face of every bay braced', () => {
  for (let i = 0; i < 30; i++) {
    const genome = founder(i)
    expect(checkGenome(problem.genome, genome)).toBeUndefined()
    expect(genomesEqual(problem.genome, problem.repair(genome), genome)).toBe(true)
    const machine = buildBody3d(genome)
    // Maxwell 1864: a braced frame of n joints has at least 3 n - 6 bars.
    expect(machine.members.length).toBeGreaterThanOrEqual(3 * machine.positionsM.length - 6)
    expect(machine.nodeMassesKg.reduce((a, b) => a + b, 0)).toBeCloseTo(machine.massKg, 12)
  }
})

test('bays have the volume of their prisms', () => {
  const share = numbers.bayLeast
  // Equal columns: triangle of breadth 0.05 and height 0.05, 0.06 long.
  for (const size of watchOf(buildBody3d(inchworm(0))).bayLeast) {
    expect(size / share).toBeCloseTo(0.5 * 0.05 * 0.05 * 0.06, 12)
  }
  for (let i = 0; i < 20; i++) {
    for (const size of watchOf(buildBody3d(founder(i))).bayLeast) expect(size).toBeGreaterThan(0)
  }
})

test('the ground is the pipe with nothing lying in it behind, and no debris is steeper than the step is chosen for', () => {
  for (let j = 0; j < 20; j++) {
    const { heightsM, rows, firstXM, spacingM, firstZM } = pipeGround(condition(j).debris)
    const columns = heightsM.length / rows
    for (let i = 0; i < heightsM.length; i++) {
      const [column, row] = [i % columns, Math.floor(i / columns)]
      const along = column > 0 ? (heightsM[i]! - heightsM[i - 1]!) / spacingM : 0
      const across = row > 0 ? (heightsM[i]! - heightsM[i - columns]!) / spacingM : 0
      if (Math.sqrt(along * along + across * across) > pipe.slopeMost) throw new Error('too steep')
      if (firstXM + column * spacingM <= 0 && heightsM[i] !== invertM(firstZM! + row * spacingM)) {
        throw new Error('debris behind the start')
      }
    }
  }
})

describe('a trial', () => {
  test('the lanes of the kernel give the bits of the reference, however many go side by side', () => {
    for (let i = 0; i < 3; i++) {
      const machine = buildBody3d(founder(i))
      const base = baseLattice(machine, pipe.steepest)
      const conditions = [0, 1, 2, 3, 4].map(condition)
      const truth = situate(base, machine, pipe, conditions).map((lattice) =>
        outcomeOf(machine, followTrial(machine, lattice)),
      )
      for (const count of [1, 3, 5]) {
        const situations = Array.from({ length: count }, (_, j) => situation(j))
        expect(problem.simulate(founder(i), situations)).toEqual(truth.slice(0, count))
      }
    }
  })

  test('pads decide the way, and an even body in a clean pipe does not leave its line', () => {
    expect(distance(inchworm(0.15), clean)).toBeGreaterThan(0.02)
    expect(distance(inchworm(0.15, 'pad-reversed'), clean)).toBeLessThan(-0.02)
    const frames = problem.frames!(inchworm(0.15), clean)
    const puck = frames.markers[0]!.node
    // The floor diagonals are not even: a few millimetres.
    for (const frame of frames.positions) expect(Math.abs(frame[3 * puck + 2]!)).toBeLessThan(0.02)
  })

  test('without stroke it stays where it settled', () => {
    expect(Math.abs(distance(inchworm(0), clean))).toBeLessThan(1e-3)
  })

  test('half the step gives nearly the same distance on a clean floor', () => {
    const whole = distance(inchworm(0.15), clean)
    const [finer] = problem.simulateFiner!(inchworm(0.15), [clean], 2)
    expect('failed' in finer!).toBe(false)
    const half = 'failed' in finer! ? Number.NaN : finer!.objectives.distance!
    expect(Math.abs(half / whole - 1)).toBeLessThan(0.03)
  })
})

test('frames run from the settled body to the end and hold the ground across', () => {
  const genome = inchworm(0.15)
  const frames = problem.frames!(genome, situation(2))
  expect(frames.dimensions).toBe(3)
  expect(frames.positions).toHaveLength(framesPerTrial + 1)
  expect(frames.positions[0]).toHaveLength(3 * 12)
  const puck = 3 * frames.markers[0]!.node
  const travelled = frames.positions.at(-1)![puck]! - frames.positions[0]![puck]!
  expect(travelled).toBeCloseTo(distance(genome, situation(2)), 12)
  const grid = frames.groundGrid!
  expect(grid.heightsM).toHaveLength(grid.countX * grid.countZ)
  expect(problem.describe!(genome).filter((line) => /N\/m/.test(line))).toHaveLength(
    buildBody3d(genome).members.length,
  )
  expect(numbers.boreM).toBe(0.2)
})
