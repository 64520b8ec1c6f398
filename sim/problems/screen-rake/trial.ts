// One trial: the water brings debris while the machine waits at its first pose, then the machine works for 12 s.
//
// Water. A piece below the water line is lifted by the weight of the water it displaces and pushed by its drag,
// 1/2 rho Cd A |w| w with w = flow - velocity and A = length times depth; in the last piece of its height both grade to
// nothing. Screen and debris do not change the flow, and the water does not push the machine: its arms are thin and
// slow. Loads of the water are renewed every 0.05 s.

import {
  type ActuatorFigures,
  actuatorFigures,
  addSample,
  startTally,
} from '../../../shared/making/measures.js'
import { type Fault, type RigidWorld, withRigid } from '../../rigid/rigid2d.js'
import type { RigidSpec } from '../../rigid/spec.js'
import type { RakeGenome } from './genome.js'
import { buildMachine, type Machine } from './machine.js'
import { lipM, numbers } from './numbers.js'
import {
  apart,
  areaOf,
  debrisBodies,
  type IntakeCondition,
  massOfPiece,
  type Piece,
  standing,
} from './screen.js'

export interface RakeFigures {
  /** Share of the debris's mass that is behind the lip at the end. */
  readonly overLip: number
  /** Mean over all mass of the way from the water line (or the start) to the lip: 1 behind the lip, else the highest reached. */
  readonly raised: number
  readonly energyJ: number
  /** Largest torque of any geared motor, before its chain stage, N m. */
  readonly peakTorqueNm: number
  readonly clearedKg: number
  readonly machineKg: number
  readonly motors: readonly ActuatorFigures[]
}

/** The world of a trial as a description for the rigid-body library. */
export function describeTrial(machine: Machine, condition: IntakeCondition, divide = 1): RigidSpec {
  return {
    gravityMps2: [0, -numbers.gravityMps2],
    stepSeconds: numbers.stepSeconds / divide,
    solverRounds: numbers.solverRounds,
    solverSweeps: numbers.solverSweeps,
    // Sizes of debris and comb.
    sizeM: 0.2,
    bodies: [standing(condition.barFriction), ...machine.bodies, ...debrisBodies(condition.pieces)],
    joints: machine.joints,
    apart,
  }
}

/** Called `framesPerSecond` times a second, from the end of the settling on. */
export type Look = (world: RigidWorld) => void

/** Runs a trial; its figures, or why and when it failed. */
export function runTrial(
  genome: RakeGenome,
  condition: IntakeCondition,
  divide = 1,
  look?: Look,
): RakeFigures | Fault {
  const machine = buildMachine(genome, condition.strengths)
  const spec = describeTrial(machine, condition, divide)
  return withRigid(spec, (world) => {
    const trial = startTrial(world, machine, condition)
    return trial.fault ?? work(trial, look) ?? figuresOf(trial)
  })
}

interface Trial {
  readonly world: RigidWorld
  readonly machine: Machine
  readonly condition: IntakeCondition
  readonly firstPiece: number
  /** Height of every piece after settling, and the largest since. */
  readonly startM: number[]
  readonly highestM: number[]
  readonly tallies: ReturnType<typeof startTally>[]
  fault: Fault | undefined
}

const stepsPerSecond = Math.round(1 / numbers.stepSeconds)
const stepsPerWater = Math.round(numbers.waterSeconds * stepsPerSecond)
const watersPerFrame = Math.round(1 / numbers.framesPerSecond / numbers.waterSeconds)

function startTrial(world: RigidWorld, machine: Machine, condition: IntakeCondition): Trial {
  const firstPiece = 1 + machine.bodies.length
  const trial: Trial = {
    world,
    machine,
    condition,
    firstPiece,
    startM: [],
    highestM: [],
    tallies: machine.driven.map(startTally),
    fault: undefined,
  }
  trial.fault = world.advance(1) ?? startsInside(trial)
  for (let i = 0; i < numbers.settleSeconds / numbers.waterSeconds && !trial.fault; i++) {
    trial.fault = advanceWater(trial)
  }
  for (let i = 0; i < condition.pieces.length; i++) {
    trial.startM.push(world.pose(firstPiece + i)[1]!)
    trial.highestM.push(trial.startM[i]!)
  }
  // What a drive did while it held still belongs to no working cycle.
  for (const i of machine.driven.keys()) {
    const drive = world.driveOf(world.joint(machine.driven[i]!.joint))
    drive.workJ = 0
    drive.workGivenJ = 0
    drive.peakEffort = 0
  }
  return trial
}

/** A machine that begins inside screen or deck cannot be put up. */
function startsInside({ world, machine }: Trial): Fault | undefined {
  const names = new Set(machine.bodies.map(({ name }) => name))
  for (const { a, b, depthM } of world.contacts()) {
    const part = names.has(a) ? a : b
    const isInside = names.has(part) && (a === 'intake' || b === 'intake') && depthM > numbers.startDepthMostM
    if (isInside) return { reason: `the ${part} begins inside screen or deck`, seconds: 0 }
  }
  return undefined
}

function advanceWater(trial: Trial): Fault | undefined {
  const { world, condition, firstPiece } = trial
  for (const [i, piece] of condition.pieces.entries()) loadPiece(world, firstPiece + i, piece, condition)
  return world.advance(Math.round(numbers.waterSeconds / world.stepSeconds))
}

function loadPiece(
  world: RigidWorld,
  body: number,
  piece: Piece,
  { waterM, flowMps }: IntakeCondition,
): void {
  const y = world.pose(body)[1]!
  const [along, across] = piece.halfM
  const size = (along + across) / 2
  const wet = Math.min(1, Math.max(0, (waterM - y) / (2 * size) + 0.5))
  if (wet === 0) {
    world.load(body, [0, 0], [0])
    return
  }
  const [vx, vy, spin] = world.velocity(body) as unknown as [number, number, number]
  const [wx, wy] = [flowMps - vx, -vy]
  const areaM2 = 2 * along * piece.depthM
  const drag =
    0.5 * numbers.waterKgpm3 * numbers.dragCoefficient * areaM2 * Math.sqrt(wx * wx + wy * wy) * wet
  const lift = numbers.waterKgpm3 * areaOf(piece) * piece.depthM * numbers.gravityMps2 * wet
  const inertia = (massOfPiece(piece) * (along * along + across * across)) / 3
  world.load(body, [drag * wx, drag * wy + lift], [(-inertia * spin * wet) / numbers.spinSeconds])
}

/** Works for the whole time; the fault that ended it, or nothing. */
function work(trial: Trial, look: Look | undefined): Fault | undefined {
  const { world, machine, condition, firstPiece, highestM } = trial
  const joints = machine.driven.map(({ joint }) => world.joint(joint))
  const rounds = Math.round(numbers.workSeconds / numbers.waterSeconds)
  for (let round = 0; round < rounds; round++) {
    if (round % watersPerFrame === 0) look?.(world)
    for (const [i, piece] of condition.pieces.entries()) loadPiece(world, firstPiece + i, piece, condition)
    for (let step = 0; step < stepsPerWater; step++) {
      const seconds = (round + (step + 1) / stepsPerWater) * numbers.waterSeconds
      for (const [i, { target }] of machine.driven.entries()) world.command(joints[i]!, target(seconds))
      const fault = world.advance(Math.round(1 / stepsPerSecond / world.stepSeconds))
      if (fault) return fault
    }
    sample(trial, joints)
    for (let i = 0; i < highestM.length; i++) {
      highestM[i] = Math.max(highestM[i]!, world.pose(firstPiece + i)[1]!)
    }
  }
  return undefined
}

function sample({ world, machine, tallies }: Trial, joints: readonly number[]): void {
  const { motor } = numbers
  for (const [i, { effortPerMotorNm }] of machine.driven.entries()) {
    const force = world.driveOf(joints[i]!).effort / effortPerMotorNm
    const length = world.placeOf(joints[i]!)
    addSample(tallies[i]!, { force, length, speed: world.rateOf(joints[i]!) }, motor, numbers.waterSeconds)
  }
}

function figuresOf({ world, machine, condition, firstPiece, startM, highestM, tallies }: Trial): RakeFigures {
  let [total, clearedKg, raised] = [0, 0, 0]
  for (const [i, piece] of condition.pieces.entries()) {
    const massKg = massOfPiece(piece)
    total += massKg
    const isOver = world.pose(firstPiece + i)[0]! > lipM[0] + numbers.clearedBehindM
    if (isOver) clearedKg += massKg
    const fromM = Math.max(condition.waterM, startM[i]!)
    const share = Math.min(1, Math.max(0, highestM[i]! - fromM) / Math.max(0.05, lipM[1] - fromM))
    raised += massKg * (isOver ? 1 : share)
  }
  const drives = machine.driven.map(({ joint }) => world.driveOf(world.joint(joint)))
  const motors = drives.map((drive, i) => ({
    ...actuatorFigures(tallies[i]!, 1, numbers.waterSeconds),
    peakForce: drive.peakEffort / machine.driven[i]!.effortPerMotorNm,
    power: drive.workGivenJ / numbers.workSeconds,
  }))
  let machineKg = 0
  for (let i = 1; i <= machine.bodies.length; i++) machineKg += world.massOf(i).massKg
  return {
    overLip: clearedKg / total,
    raised: raised / total,
    energyJ: drives.reduce((sum, drive) => sum + drive.workGivenJ, 0),
    peakTorqueNm: motors.reduce((most, { peakForce }) => Math.max(most, peakForce), 0),
    clearedKg,
    machineKg,
    motors,
  }
}
