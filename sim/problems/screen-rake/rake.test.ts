// The screen rake: its repair, its water, its drives' limits, and that it is the same to the bit every time.

import { describe, expect, test } from 'vitest'
import { conditionStream } from '../../../shared/conditions.js'
import { randomGenome } from '../../../shared/encodings.js'
import type { Measured } from '../../../shared/problem.js'
import { stream } from '../../../shared/streams.js'
import { layouts, type RakeGenome, rakeGenome } from './genome.js'
import problem from './index.js'
import { buildMachine } from './machine.js'
import { bendM, bendStartM, lipM, numbers } from './numbers.js'
import { beginsClear, repairRake } from './repair.js'
import {
  debrisBodies,
  drawIntake,
  type IntakeCondition,
  lipWayM,
  massOfPiece,
  type Piece,
  volumeOf,
  wayM,
} from './screen.js'
import { runTrial } from './trial.js'

const conditionOf = (replicate: number) => drawIntake(conditionStream(20_261_201, true, 0, replicate))
const randomRake = (i: number): RakeGenome =>
  randomGenome(rakeGenome, stream(11, 'founder', 1, i)) as RakeGenome

/**
 * A rake with a wrist, its way drawn by hand (up the screen with the tines between the bars, over the bend, back through
 * the water), then bettered in 117 small random steps; rounded to millimetres and thousandths.
 */
const found: RakeGenome = {
  layout: Int32Array.of(1),
  baseX: Float64Array.of(-0.07),
  baseY: Float64Array.of(1.942),
  links: Float64Array.of(1.046, 1.011),
  pathAlong: Float64Array.of(0.798),
  pathOff: Float64Array.of(0.152),
  swingAlong: Float64Array.of(-0.6, 0.286, 0.091, -0.138),
  swingOff: Float64Array.of(0.073, -0.3, -0.022, 0.086),
  tilt: Float64Array.of(-36.865),
  tiltSwing: Float64Array.of(23.273, 50.019),
  period: Float64Array.of(5.346),
  gear: Int32Array.of(1, 2, 1),
  combAngle: Float64Array.of(-29.351),
  tine: Float64Array.of(0.201),
  hook: Float64Array.of(0.043),
  hookAngle: Float64Array.of(21.109),
  crank: Float64Array.of(0.135),
  rocker: Float64Array.of(0.411),
  rockerPin: Float64Array.of(0.53),
  rockerPinAngle: Float64Array.of(-6.381),
}
/** Two arms, told to stay where they are parked. */
const still: RakeGenome = {
  ...found,
  layout: Int32Array.of(layouts.indexOf('two-arm')),
  baseX: Float64Array.of(0.325),
  baseY: Float64Array.of(1.609),
  links: Float64Array.of(0.667, 1.037),
  combAngle: Float64Array.of(33.001),
  tine: Float64Array.of(0.154),
  hook: Float64Array.of(0.049),
  hookAngle: Float64Array.of(59.788),
  gear: Int32Array.of(2, 2, 2),
  pathAlong: Float64Array.of(1.2),
  pathOff: Float64Array.of(0.5),
  swingAlong: new Float64Array(4),
  swingOff: new Float64Array(4),
}

function figures(genome: RakeGenome, condition: IntakeCondition, divide = 1) {
  const result = runTrial(genome, condition, divide)
  if ('reason' in result) throw new Error(`${result.reason} at ${result.seconds} s`)
  return result
}

describe('repair', () => {
  test('is pure, changes nothing twice, and finds a start that is clear for nine in ten', () => {
    let clear = 0
    for (let i = 0; i < 200; i++) {
      const genome = randomRake(i)
      const before = JSON.stringify(genome)
      const once = repairRake(genome)
      expect(JSON.stringify(genome)).toBe(before)
      expect(repairRake(once)).toEqual(once)
      if (beginsClear(once)) clear++
    }
    expect(clear).toBeGreaterThan(170)
  })

  test('makes cranks that turn all the way round: the four bars close at every angle', () => {
    for (let i = 0; i < 300; i++) {
      const genome = repairRake({ ...randomRake(i), layout: Int32Array.of(layouts.indexOf('crank')) })
      const [crank, coupler, rocker, pin] = [genome.crank, genome.links, genome.rocker, genome.rockerPin].map(
        (part) => part[0]!,
      ) as [number, number, number, number]
      expect(crank).toBeGreaterThanOrEqual(0.1 - 1e-12)
      // Crank end to rocker pin is between pin - crank and pin + crank: coupler and rocker must span both.
      expect(coupler + rocker).toBeGreaterThan(pin + crank)
      expect(Math.abs(coupler - rocker)).toBeLessThan(pin - crank)
    }
  })

  test('a machine that begins inside the deck is a failed simulation that says so', () => {
    // A straight arm from behind the lip into the water goes through the screen.
    const inside = {
      ...still,
      layout: Int32Array.of(layouts.indexOf('sliding-arm')),
      baseX: Float64Array.of(0.8),
      baseY: Float64Array.of(1.4),
      links: Float64Array.of(1, 1.3),
      pathAlong: Float64Array.of(0.4),
      pathOff: Float64Array.of(0.2),
    }
    const [outcome] = problem.simulate(inside, [{ condition: conditionOf(0), case: '' }])
    expect(outcome).toEqual({ failed: expect.stringMatching(/begins inside screen or deck at 0.00 s/) })
  })
})

describe('the way along the bars', () => {
  const radiusM = 0.05
  /** Places of the middle of a disc that slides along the bars, from the foot to the lip. */
  const places = Array.from({ length: 201 }, (_, i): readonly [number, number] => {
    const way = (i / 200) * lipWayM
    if (way <= numbers.screenLengthM) {
      const part = way / numbers.screenLengthM
      return [
        bendStartM[0] * part - radiusM * Math.sin(numbers.screenAngle),
        bendStartM[1] * part + radiusM * Math.cos(numbers.screenAngle),
      ]
    }
    const turn = numbers.screenAngle - (way - numbers.screenLengthM) / numbers.bendRadiusM
    const awayM = numbers.bendRadiusM + radiusM
    return [bendM[0] - awayM * Math.sin(turn), bendM[1] + awayM * Math.cos(turn)]
  })

  test('grows all along the straight piece and round the bend by what was gone, and ends at the lip', () => {
    for (const [i, place] of places.entries()) expect(wayM(place)).toBeCloseTo((i / 200) * lipWayM, 9)
    expect(wayM([lipM[0] + 0.05, lipM[1]])).toBe(lipWayM)
    expect(wayM([lipM[0] + 0.2, lipM[1] - 0.5])).toBe(lipWayM)
  })

  test('is no longer for a piece that is high above the water but before the screen', () => {
    expect(wayM([-0.5, 1])).toBeLessThan(numbers.screenLengthM)
    expect(wayM([-0.5, 2])).toBeLessThan(lipWayM - numbers.bendRadiusM)
  })
})

describe('the water', () => {
  const piece: Piece = {
    kind: 'leaves',
    radiusM: 0.06,
    depthM: 0.3,
    densityKgpm3: 500,
    friction: 0.5,
    positionM: [-1, 0.5],
  }
  const pond = (change: Partial<Piece>, waterM = 0.9): IntakeCondition => {
    return { barFriction: 0.4, flowMps: 0, waterM, strengths: [1, 1, 1], pieces: [{ ...piece, ...change }] }
  }
  /** Heights of the one piece, 20 times a second. */
  const heights = (condition: IntakeCondition) => {
    const seen: number[] = []
    const body = debrisBodies(condition.pieces)[0]!.name
    runTrial(still, condition, 1, (world) => seen.push(world.pose(world.body(body))[1]!))
    return seen
  }

  test('carries a piece of half its density half under the surface', () => {
    // It bobs on: the mean of the last 3 s.
    const last = heights(pond({})).slice(-60)
    expect(last.reduce((sum, y) => sum + y / 60, 0)).toBeCloseTo(0.9, 2)
  })

  test('lets a heavy piece sink at the speed at which drag carries its weight', () => {
    // 1/2 rho Cd A v^2 = (density - rho) V g: common practice, no source.
    const heavy = { ...piece, densityKgpm3: 1040, positionM: [-1, 8] as const }
    const seen = heights(pond(heavy, 9))
    const area = 2 * heavy.radiusM * heavy.depthM
    const speed = Math.sqrt(
      (2 * 40 * volumeOf(heavy) * numbers.gravityMps2) / (1000 * numbers.dragCoefficient * area),
    )
    expect((seen[20]! - seen[100]!) / 4 / speed).toBeCloseTo(1, 2)
  })

  test('presses pieces onto the screen and holds them there', () => {
    const condition = { ...pond({ densityKgpm3: 900 }), flowMps: 0.4 }
    let x = 0
    runTrial(still, condition, 1, (world) => {
      x = world.pose(world.body('leaves 1'))[0]!
    })
    expect(x).toBeGreaterThan(0)
    expect(x).toBeLessThan(lipM[0])
  })
})

describe('a trial', () => {
  test('of a rake made for it can carry most of the debris over the lip within its 6 s; one that stands still moves none', () => {
    const days = Array.from({ length: 12 }, (_, j) => figures(found, conditionOf(j)))
    expect(days.reduce((sum, { raised }) => sum + raised / 12, 0)).toBeGreaterThan(0.4)
    expect(days[0]!.overLip).toBeGreaterThan(0.5)
    for (let j = 0; j < 2; j++) {
      const { overLip, raised, energyJ } = figures(still, conditionOf(j))
      expect(overLip).toBe(0)
      expect(raised).toBeLessThan(0.01)
      expect(energyJ).toBeLessThan(2)
    }
  })

  test('of a machine that stands still has the worst energy and torque there is: idleness is no merit', () => {
    const [outcome] = problem.simulate(still, [{ condition: conditionOf(0), case: '' }])
    expect((outcome as Measured).objectives.energy).toBe(10_000)
    expect((outcome as Measured).objectives.peakTorque).toBeCloseTo(1.05 * numbers.motor.forceMost, 9)
  })

  test('keeps every motor within the torque and power of its class', () => {
    for (const genome of [found, repairRake(randomRake(3)), repairRake(randomRake(4))]) {
      const { motors, peakTorqueNm, energyJ } = figures(genome, conditionOf(1))
      expect(peakTorqueNm).toBeLessThanOrEqual(numbers.motor.forceMost * 1.05 + 1e-9)
      for (const { power, duty } of motors) {
        expect(power).toBeLessThanOrEqual(numbers.motor.powerMost * 1.05)
        expect(duty).toBeLessThanOrEqual(1)
      }
      expect(energyJ).toBeCloseTo(
        motors.reduce((sum, { power }) => sum + power * numbers.workSeconds, 0),
        6,
      )
    }
  })

  test('gives the same bits twice, whatever was simulated between', () => {
    const situations = [0, 1].map((j) => ({ condition: conditionOf(j), case: '' }))
    const first = problem.simulate(found, situations)
    problem.simulate(repairRake(randomRake(5)), situations)
    expect(problem.simulate(found, [...situations].reverse()).reverse()).toEqual(first)
    // Equal on every machine; changes with the problem's version only, which names the library's.
    expect((first[0] as Measured).objectives).toEqual(golden)
    expect(problem.version).toBe('3+rapier2d-deterministic-0.20.0')
  })

  test('masses are those that were drawn', () => {
    const condition = conditionOf(2)
    const total = condition.pieces.reduce((sum, piece) => sum + massOfPiece(piece), 0)
    runTrial(found, condition, 1, (world) => {
      if (world.seconds > 0.6) return
      const first = 1 + buildMachine(found).bodies.length
      const masses = condition.pieces.map((_, i) => world.massOf(first + i).massKg)
      expect(masses.reduce((sum, one) => sum + one, 0) / total).toBeCloseTo(1, 5)
    })
  })
})

test('the replay has every piece in every frame, and the paper every link and motor', () => {
  const situation = { condition: conditionOf(0), case: '' }
  for (const genome of layouts.map((_, i) => repairRake({ ...randomRake(9), layout: Int32Array.of(i) }))) {
    const frames = problem.frames!(genome, situation)
    expect(frames.positions.length).toBeGreaterThan(0)
    for (const { poses } of frames.bodies!) {
      expect(poses.length).toBe(frames.positions.length)
      expect(poses.every((pose) => pose.length === 3 && pose.every(Number.isFinite))).toBe(true)
    }
    expect(frames.motors!.length).toBe(buildMachine(genome).driven.length)
    const lines = problem.describe!(genome).join('\n')
    for (const { joint } of buildMachine(genome).driven) expect(lines).toContain(`${joint} motor`)
    expect(problem.cautions!(genome).map(({ hazard }) => hazard)).toContain('Tines shearing between bars')
  }
})

const golden = { cleared: 0.5993539533186634, energy: 31.552940711956975, peakTorque: 30.111360105650732 }
