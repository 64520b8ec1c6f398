// From a genome to the machine: bodies, joints and drives at the first pose of the drive table. Every link lies along
// its own x axis with its origin at its first pin; the turn of a link is the direction of that axis.

import { atan2 } from '../../../shared/detmath/inverse-trigonometry.js'
import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import type { BodySpec, JointSpec, MotorSpec, ShapeSpec } from '../../rigid/spec.js'
import { layoutOf, poseShare, type RakeGenome, ratioOf } from './genome.js'
import { driveOf, numbers } from './numbers.js'

export interface Driven {
  readonly joint: string
  /** Ratio of its chain stage. */
  readonly ratio: number
  /** Effort of the joint at 1 N m of the geared motor: ratio times efficiency, over the pinion of a slider. */
  readonly effortPerMotorNm: number
  /** Where the joint is told to be, rad or m, this long after the start of work. */
  readonly target: (seconds: number) => number
}

export interface Machine {
  readonly bodies: readonly BodySpec[]
  readonly joints: readonly JointSpec[]
  readonly driven: readonly Driven[]
  /** Straight pieces of each body, in its own axes, for the replay and the parts list: from, to, what it is. */
  readonly outlines: readonly Outline[]
}
export interface Outline {
  readonly body: string
  readonly label: string
  readonly from: readonly [number, number]
  readonly to: readonly [number, number]
  readonly radiusM: number
}

type Place = readonly [number, number]
const { degree } = numbers

/** Ranges of the joints: direction of the first link from straight down, then turns against the link before. */
export const ranges = {
  shoulder: [-110 * degree, 70 * degree],
  elbow: [-150 * degree, 150 * degree],
  wrist: [-120 * degree, 120 * degree],
} as const

const within = ([low, high]: readonly [number, number], share: number) => low + (high - low) * share

function along(from: Place, turn: number, lengthM: number): Place {
  return [from[0] + lengthM * cos(turn), from[1] + lengthM * sin(turn)]
}

/** A bar of tube between two places of a body. */
function bar(body: string, label: string, from: Place, to: Place): { shape: ShapeSpec; outline: Outline } {
  const [dx, dy] = [to[0] - from[0], to[1] - from[1]]
  const lengthM = Math.sqrt(dx * dx + dy * dy)
  const isTine = label === 'comb'
  const widthM = isTine ? numbers.tineWidthM : numbers.linkWidthM
  const kgpm = isTine ? numbers.tineKgpm * numbers.tineCount : numbers.linkKgpm
  return {
    shape: {
      outline: { kind: 'box', halfM: [lengthM / 2, widthM / 2] },
      atM: [(from[0] + to[0]) / 2, (from[1] + to[1]) / 2],
      turn: atan2(dy, dx),
      material: { friction: numbers.machineFriction, density: kgpm / widthM },
      layer: isTine ? 'tines' : 'arms',
    },
    outline: { body, label, from, to, radiusM: widthM / 2 },
  }
}

/** Collects bodies as they are put together. */
class Assembly {
  readonly bodies: BodySpec[] = []
  readonly joints: JointSpec[] = []
  readonly driven: Driven[] = []
  readonly outlines: Outline[] = []
  private readonly strengths: readonly number[]
  private readonly genome: RakeGenome

  constructor(genome: RakeGenome, strengths: readonly number[]) {
    this.genome = genome
    this.strengths = strengths
  }

  /**
   * A link with its bars; `motorAtM` is where a motor hangs on it. A link that is turned by motor number `turnedBy` has
   * that motor's rotor as inertia, geared up: exact for a motor on the base, nearly so for one that rides on a link,
   * whose rotor turns with the link against the one before. A slider's is left out.
   */
  link(
    name: string,
    at: Place,
    turn: number,
    bars: readonly [string, Place, Place][],
    { motorAtM, turnedBy }: { readonly motorAtM?: Place; readonly turnedBy?: number } = {},
  ): void {
    const made = bars.map(([label, from, to]) => bar(name, label, from, to))
    const shapes = made.map(({ shape }) => shape)
    const comb = bars.find(([label]) => label === 'comb')
    if (comb) shapes.push(crossBar(comb[1]))
    this.outlines.push(...made.map(({ outline }) => outline))
    if (comb) {
      const radiusM = numbers.crossBarRadiusM
      this.outlines.push({ body: name, label: 'cross bar', from: comb[1], to: comb[1], radiusM })
    }
    const ratio = turnedBy === undefined ? 0 : ratioOf(this.genome, turnedBy)
    const extra = {
      massKg: motorAtM ? numbers.motorKg : 1e-3,
      centreM: motorAtM ?? [0, 0],
      inertiaKgm2: (motorAtM ? 0.005 : 0) + numbers.rotorKgm2 * ratio * ratio,
    }
    this.bodies.push({ name, positionM: at, turn, shapes, ...(motorAtM || ratio > 0 ? { extra } : {}) })
  }

  hinge(
    name: string,
    a: string,
    b: string,
    onAM: Place,
    target?: Driven['target'],
    onBM: Place = [0, 0],
  ): void {
    const motor = target && this.motor(name, target, 1)
    this.joints.push({ name, kind: 'hinge', a, b, onAM, onBM, ...(motor ? { motor } : {}) })
  }

  slider(name: string, a: string, b: string, onAM: Place, strokeM: number, target: Driven['target']): void {
    const motor = this.motor(name, target, 1 / numbers.pinionM)
    const range = [0, strokeM] as const
    this.joints.push({ name, kind: 'slider', a, b, onAM, onBM: [0, 0], axis: [1, 0], range, motor })
  }

  private motor(joint: string, target: Driven['target'], perTorque: number): MotorSpec {
    const i = this.driven.length
    const ratio = ratioOf(this.genome, i)
    const { effortMost, rateMost, powerMostW } = driveOf(ratio)
    this.driven.push({ joint, ratio, effortPerMotorNm: ratio * numbers.stageEfficiency * perTorque, target })
    const error = perTorque === 1 ? numbers.fullEffortRad : numbers.fullEffortM
    const strength = this.strengths[i]!
    const stiffness = (effortMost * perTorque) / error
    return {
      stiffness,
      damping: stiffness * numbers.dampingSeconds,
      effortMost: effortMost * perTorque * strength,
      rateMost: rateMost / perTorque,
      rampMost: rateMost / perTorque / numbers.rampSeconds,
      powerMostW: powerMostW * strength,
    }
  }
}

function crossBar(at: Place): ShapeSpec {
  const { crossBarRadiusM: radiusM, crossBarKg } = numbers
  const density = crossBarKg / (Math.PI * radiusM * radiusM)
  const material = { friction: numbers.machineFriction, density }
  return { outline: { kind: 'ball', radiusM }, atM: at, material, layer: 'beam' }
}

/** Tines and their hooks from a place of a body, turned against its axis. */
function combBars(genome: RakeGenome, at: Place): [string, Place, Place][] {
  const turn = genome.combAngle[0]! * degree
  const end = along(at, turn, genome.tine[0]!)
  const bars: [string, Place, Place][] = [['comb', at, end]]
  // A hook shorter than a centimetre is only the rounding of the tip.
  if (genome.hook[0]! >= 0.01) {
    bars.push(['comb', end, along(end, turn + genome.hookAngle[0]! * degree, genome.hook[0]!)])
  }
  return bars
}

type Builder = (genome: RakeGenome, assembly: Assembly, base: Place) => void

const builders: { readonly [layout in ReturnType<typeof layoutOf>]: Builder } = {
  'two-arm': (genome, assembly, base) => arms(genome, assembly, base, false),
  'three-arm': (genome, assembly, base) => arms(genome, assembly, base, true),
  'sliding-arm': slidingArm,
  crank: crankMachine,
}

/** Turn of the first link: its joint's place, as the base does not turn. */
const shoulderTurn = (genome: RakeGenome) => (seconds: number) =>
  within(ranges.shoulder, poseShare(genome, 0, seconds)) - Math.PI / 2

function arms(genome: RakeGenome, assembly: Assembly, base: Place, hasWrist: boolean): void {
  const [armM, forearmM] = [genome.links[0]!, genome.links[1]!]
  const shoulder = shoulderTurn(genome)
  const elbow = (seconds: number) => within(ranges.elbow, poseShare(genome, 1, seconds))
  const wrist = (seconds: number) => within(ranges.wrist, poseShare(genome, 2, seconds))
  const elbowAt = along(base, shoulder(0), armM)
  const forearmTurn = shoulder(0) + elbow(0)
  const tip: Place = [forearmM, 0]
  assembly.link('arm', base, shoulder(0), [['arm', [0, 0], [armM, 0]]], {
    motorAtM: [armM, 0],
    turnedBy: 0,
  })
  const forearm: [string, Place, Place] = ['forearm', [0, 0], tip]
  if (hasWrist) {
    assembly.link('forearm', elbowAt, forearmTurn, [forearm], { motorAtM: tip, turnedBy: 1 })
    assembly.link(
      'comb',
      along(elbowAt, forearmTurn, forearmM),
      forearmTurn + wrist(0),
      combBars(genome, [0, 0]),
      { turnedBy: 2 },
    )
  } else assembly.link('forearm', elbowAt, forearmTurn, [forearm, ...combBars(genome, tip)], { turnedBy: 1 })
  assembly.hinge('shoulder', 'intake', 'arm', base, shoulder)
  assembly.hinge('elbow', 'arm', 'forearm', [armM, 0], elbow)
  if (hasWrist) assembly.hinge('wrist', 'forearm', 'comb', tip, wrist)
}

/** The rod's origin is its outer end; it reaches back into the arm. */
function slidingArm(genome: RakeGenome, assembly: Assembly, base: Place): void {
  const [armM, rodM] = [genome.links[0]!, genome.links[1]!]
  const strokeM = 0.8 * Math.min(armM, rodM)
  const shoulder = shoulderTurn(genome)
  const slide = (seconds: number) => strokeM * poseShare(genome, 1, seconds)
  const turn = shoulder(0)
  assembly.link('arm', base, turn, [['arm', [0, 0], [armM, 0]]], { motorAtM: [0.1, 0], turnedBy: 0 })
  const bars: [string, Place, Place][] = [['rod', [-rodM, 0], [0, 0]], ...combBars(genome, [0, 0])]
  assembly.link('rod', along(base, turn, armM + slide(0)), turn, bars)
  assembly.hinge('shoulder', 'intake', 'arm', base, shoulder)
  assembly.slider('slide', 'arm', 'rod', [armM, 0], strokeM, slide)
}

/** The coupler reaches on beyond the rocker's pin to the comb. */
function crankMachine(genome: RakeGenome, assembly: Assembly, base: Place): void {
  const [crankM, couplerM, rockerM] = [genome.crank[0]!, genome.links[0]!, genome.rocker[0]!]
  const crankTurn = (seconds: number) => 2 * Math.PI * (genome.poses[0]! + seconds / genome.period[0]!)
  const pin = along(base, genome.rockerPinAngle[0]! * degree, genome.rockerPin[0]!)
  const crankEnd = along(base, crankTurn(0), crankM)
  const meet = meetingPoint(crankEnd, couplerM, pin, rockerM)
  const couplerTurn = atan2(meet[1] - crankEnd[1], meet[0] - crankEnd[0])
  const rockerTurn = atan2(meet[1] - pin[1], meet[0] - pin[0])
  const tip: Place = [couplerM + genome.links[1]!, 0]
  assembly.link('crank', base, crankTurn(0), [['crank', [0, 0], [crankM, 0]]], { turnedBy: 0 })
  assembly.link('coupler', crankEnd, couplerTurn, [['coupler', [0, 0], tip], ...combBars(genome, tip)])
  assembly.link('rocker', pin, rockerTurn, [['rocker', [0, 0], [rockerM, 0]]])
  assembly.hinge('crank pin', 'intake', 'crank', base, crankTurn)
  assembly.hinge('coupler pin', 'crank', 'coupler', [crankM, 0])
  assembly.hinge('rocker pin', 'intake', 'rocker', pin)
  assembly.hinge('joint pin', 'coupler', 'rocker', [couplerM, 0], undefined, [rockerM, 0])
}

/** Where two bars meet, on the right of the way from the first pin to the second (the lower side of a left-hand pin). */
function meetingPoint(a: Place, fromA: number, b: Place, fromB: number): Place {
  const [dx, dy] = [b[0] - a[0], b[1] - a[1]]
  const distance = Math.sqrt(dx * dx + dy * dy)
  const x = (distance * distance + fromA * fromA - fromB * fromB) / (2 * distance)
  // Repair keeps this above 0; rounding may not.
  const y = Math.sqrt(Math.max(0, fromA * fromA - x * x))
  return [a[0] + (dx * x + dy * y) / distance, a[1] + (dy * x - dx * y) / distance]
}

/** The machine at its first pose, its motors as strong as given (1 for as their class says). */
export function buildMachine(genome: RakeGenome, strengths: readonly number[] = [1, 1, 1]): Machine {
  const assembly = new Assembly(genome, strengths)
  builders[layoutOf(genome)](genome, assembly, [genome.baseX[0]!, genome.baseY[0]!])
  const { bodies, joints, driven, outlines } = assembly
  return { bodies, joints, driven, outlines }
}
