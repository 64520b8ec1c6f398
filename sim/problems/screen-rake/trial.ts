// One trial: the water presses debris onto the screen while the machine stands parked, then the machine works for 6 s.
//
// Water. A piece below the water line is lifted by the weight of the water it displaces and pushed by its drag,
// 1/2 rho Cd A |w| w with w = flow - velocity and A = diameter times depth; in the last piece of its height both grade to
// nothing. Screen and debris do not change the flow, and the water does not push the machine: its arms are thin and
// slow.

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
import { numbers } from './numbers.js'
import {
  apart,
  debrisBodies,
  type IntakeCondition,
  lipWayM,
  massOfPiece,
  type Piece,
  standing,
  volumeOf,
  wayM,
} from './screen.js'

export interface RakeFigures {
  /** Share of the debris's mass that is behind the lip at the end. */
  readonly overLip: number
  /** Mean over all mass of the share of its way along the bars to behind the lip: 1 behind it at the end, else the most that was made. */
  readonly raised: number
  readonly totalKg: number
  readonly energyJ: number
  /** Largest torque of any geared motor, before its chain stage, N m. */
  readonly peakTorqueNm: number
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
  /** How far along the bars every piece was after settling, and the most since. */
  readonly startM: number[]
  readonly mostM: number[]
  readonly tallies: ReturnType<typeof startTally>[]
  fault: Fault | undefined
}

const samplesPerFrame = Math.round(1 / numbers.framesPerSecond / numbers.sampleSeconds)

function startTrial(world: RigidWorld, machine: Machine, condition: IntakeCondition): Trial {
  const firstPiece = 1 + machine.bodies.length
  const trial: Trial = {
    world,
    machine,
    condition,
    firstPiece,
    startM: [],
    mostM: [],
    tallies: machine.driven.map(startTally),
    fault: undefined,
  }
  world.advance(1)
  trial.fault = startsInside(trial)
  const steps = Math.round(numbers.settleSeconds / world.stepSeconds)
  for (let i = 0; i < steps && !trial.fault; i++) trial.fault = advanceOnce(trial)
  for (let i = 0; i < condition.pieces.length; i++) {
    trial.startM.push(wayOfM(world, firstPiece + i))
    trial.mostM.push(trial.startM[i]!)
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

/** How far along the bars a piece is, m. */
function wayOfM(world: RigidWorld, body: number): number {
  const { pose } = world.peek(body)
  return wayM([pose[0]!, pose[1]!])
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

/** One step of the world, under the loads of the water. */
function advanceOnce(trial: Trial): Fault | undefined {
  const { world, condition, firstPiece } = trial
  for (const [i, piece] of condition.pieces.entries()) loadPiece(world, firstPiece + i, piece, condition)
  return world.advance(1)
}

function loadPiece(
  world: RigidWorld,
  body: number,
  piece: Piece,
  { waterM, flowMps }: IntakeCondition,
): void {
  const { pose, velocity } = world.peek(body)
  const { radiusM, depthM } = piece
  const wet = Math.min(1, Math.max(0, (waterM - pose[1]!) / (2 * radiusM) + 0.5))
  if (wet === 0) {
    world.load(body, [0, 0], [0])
    return
  }
  const [wx, wy] = [flowMps - velocity[0]!, -velocity[1]!]
  const areaM2 = 2 * radiusM * depthM
  const drag =
    0.5 * numbers.waterKgpm3 * numbers.dragCoefficient * areaM2 * Math.sqrt(wx * wx + wy * wy) * wet
  const lift = numbers.waterKgpm3 * volumeOf(piece) * numbers.gravityMps2 * wet
  world.load(body, [drag * wx, drag * wy + lift], [0])
}

/** Works for the whole time; the fault that ended it, or nothing. */
function work(trial: Trial, look: Look | undefined): Fault | undefined {
  const { world, machine, firstPiece, mostM } = trial
  const joints = machine.driven.map(({ joint }) => world.joint(joint))
  const stepsPerSample = Math.round(numbers.sampleSeconds / world.stepSeconds)
  const samples = Math.round(numbers.workSeconds / numbers.sampleSeconds)
  for (let i = 0; i < samples; i++) {
    if (i % samplesPerFrame === 0) look?.(world)
    for (let step = 1; step <= stepsPerSample; step++) {
      const seconds = (i + step / stepsPerSample) * numbers.sampleSeconds
      for (const [k, { target }] of machine.driven.entries()) world.command(joints[k]!, target(seconds))
      const fault = advanceOnce(trial)
      if (fault) return fault
    }
    sample(trial, joints)
    for (let k = 0; k < mostM.length; k++) {
      mostM[k] = Math.max(mostM[k]!, wayOfM(world, firstPiece + k))
    }
  }
  return world.look()
}

function sample({ world, machine, tallies }: Trial, joints: readonly number[]): void {
  const { motor } = numbers
  for (const [i, { effortPerMotorNm }] of machine.driven.entries()) {
    const force = world.driveOf(joints[i]!).effort / effortPerMotorNm
    const length = world.placeOf(joints[i]!)
    addSample(tallies[i]!, { force, length, speed: world.rateOf(joints[i]!) }, motor, numbers.sampleSeconds)
  }
}

function figuresOf({ world, machine, condition, firstPiece, startM, mostM, tallies }: Trial): RakeFigures {
  let [totalKg, overKg, raisedKg] = [0, 0, 0]
  for (const [i, piece] of condition.pieces.entries()) {
    const massKg = massOfPiece(piece)
    totalKg += massKg
    const isOver = wayOfM(world, firstPiece + i) >= lipWayM
    if (isOver) overKg += massKg
    raisedKg += massKg * (isOver ? 1 : (mostM[i]! - startM[i]!) / (lipWayM - startM[i]!))
  }
  const drives = machine.driven.map(({ joint }) => world.driveOf(world.joint(joint)))
  const motors = drives.map((drive, i) => ({
    ...actuatorFigures(tallies[i]!, 1, numbers.sampleSeconds),
    peakForce: drive.peakEffort / machine.driven[i]!.effortPerMotorNm,
    power: drive.workGivenJ / numbers.workSeconds,
  }))
  let machineKg = 0
  for (let i = 1; i <= machine.bodies.length; i++) machineKg += world.massOf(i).massKg
  return {
    overLip: overKg / totalKg,
    raised: raisedKg / totalKg,
    totalKg,
    energyJ: drives.reduce((sum, drive) => sum + drive.workGivenJ, 0),
    peakTorqueNm: motors.reduce((most, { peakForce }) => Math.max(most, peakForce), 0),
    machineKg,
    motors,
  }
}
