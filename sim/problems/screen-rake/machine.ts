// From a genome to the machine: bodies, joints and drives at the first pose of the drive table. Every link lies along
// its own x axis with its origin at its first pin; the turn of a link is the direction of that axis.

import { atan2 } from '../../../shared/detmath/inverse-trigonometry.js'
import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import type { BodySpec, JointSpec, MotorSpec, ShapeSpec } from '../../rigid/spec.js'
import { layoutOf, pathAt, type RakeGenome, ratioOf, tiltAt } from './genome.js'
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

/** Tines and their hooks from a place of a body, turned against its axis by so many degrees. */
function combBars(genome: RakeGenome, at: Place, degrees = genome.combAngle[0]!): [string, Place, Place][] {
  const turn = degrees * degree
  const end = along(at, turn, genome.tine[0]!)
  const bars: [string, Place, Place][] = [['comb', at, end]]
  // A hook shorter than a centimetre is only the rounding of the tip.
  if (genome.hook[0]! >= 0.01) {
    bars.push(['comb', end, along(end, turn + genome.hookAngle[0]! * degree, genome.hook[0]!)])
  }
  return bars
}

interface Reach {
  /** From straight down. */
  readonly direction: number
  readonly distanceM: number
}

/** The way from the base pin to where the comb shall be; a path that goes higher than the pin is led just below it. */
function reachOf(genome: RakeGenome, base: Place, turns: number): Reach {
  const [x, y] = pathAt(genome, turns)
  const [dx, down] = [x - base[0], Math.max(numbers.belowPinM, base[1] - y)]
  return { direction: atan2(dx, down), distanceM: Math.sqrt(dx * dx + down * down) }
}

/**
 * Places of shoulder (turn of the arm) and elbow that put the end of the forearm there, or as near as it reaches. Of the
 * two ways to bend, the one whose elbow stands out over the water.
 */
function bentArms(
  genome: RakeGenome,
  base: Place,
  turns: number,
): readonly [shoulder: number, elbow: number] {
  const [a, b] = [genome.links[0]!, genome.links[1]!]
  const { direction, distanceM } = reachOf(genome, base, turns)
  const c = Math.min(bendLeast, Math.max(-bendLeast, (distanceM * distanceM - a * a - b * b) / (2 * a * b)))
  const s = Math.sqrt(1 - c * c)
  return [direction - Math.PI / 2 - atan2(b * s, a + b * c), atan2(s, c)]
}

/** Cosine of the least bend of an elbow, stretched or folded: 10 degrees. */
const bendLeast = cos(10 * degree)

/** Places of shoulder and slide that put the end of the rod there, or as near as it reaches. */
function stretchedArm(
  genome: RakeGenome,
  base: Place,
  turns: number,
): readonly [shoulder: number, slideM: number] {
  const { direction, distanceM } = reachOf(genome, base, turns)
  return [direction - Math.PI / 2, Math.min(strokeOf(genome), Math.max(0, distanceM - genome.links[0]!))]
}

const strokeOf = ({ links }: RakeGenome) => 0.8 * Math.min(links[0]!, links[1]!)
const crankTurn = (turns: number) => 2 * Math.PI * turns

interface Design {
  readonly genome: RakeGenome
  readonly base: Place
  /** The part of the cycle in which it begins, in turns. */
  readonly start: number
}

interface Kind {
  /** Where the comb is fixed, in this part of the cycle. */
  readonly combAt: (genome: RakeGenome, base: Place, turns: number) => Place
  readonly build: (design: Design, assembly: Assembly) => void
}

const kinds: { readonly [layout in ReturnType<typeof layoutOf>]: Kind } = {
  'two-arm': { combAt: endOfArms, build: (design, assembly) => arms(design, assembly, false) },
  'three-arm': { combAt: endOfArms, build: (design, assembly) => arms(design, assembly, true) },
  'sliding-arm': {
    combAt: (genome, base, turns) => {
      const [shoulder, slideM] = stretchedArm(genome, base, turns)
      return along(base, shoulder, genome.links[0]! + slideM)
    },
    build: slidingArm,
  },
  crank: {
    combAt: (genome, base, turns) => {
      const { crankEnd, couplerTurn } = fourBars(genome, base, turns)
      return along(crankEnd, couplerTurn, genome.links[0]! + genome.links[1]!)
    },
    build: crankMachine,
  },
}

function endOfArms(genome: RakeGenome, base: Place, turns: number): Place {
  const [shoulder, elbow] = bentArms(genome, base, turns)
  return along(along(base, shoulder, genome.links[0]!), shoulder + elbow, genome.links[1]!)
}

/** Where a joint is told to be, seconds after the start of work. */
const told =
  ({ genome, start }: Design, place: (turns: number) => number) =>
  (seconds: number) =>
    place(start + seconds / genome.period[0]!)

function arms(design: Design, assembly: Assembly, hasWrist: boolean): void {
  const { genome, base } = design
  const [armM, forearmM] = [genome.links[0]!, genome.links[1]!]
  const shoulder = told(design, (turns) => bentArms(genome, base, turns)[0])
  const elbow = told(design, (turns) => bentArms(genome, base, turns)[1])
  const wrist = told(design, (turns) => {
    const [shoulderTurn, elbowTurn] = bentArms(genome, base, turns)
    return tiltAt(genome, turns) * degree - shoulderTurn - elbowTurn
  })
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
      combBars(genome, [0, 0], 0),
      { turnedBy: 2 },
    )
  } else assembly.link('forearm', elbowAt, forearmTurn, [forearm, ...combBars(genome, tip)], { turnedBy: 1 })
  assembly.hinge('shoulder', 'intake', 'arm', base, shoulder)
  assembly.hinge('elbow', 'arm', 'forearm', [armM, 0], elbow)
  if (hasWrist) assembly.hinge('wrist', 'forearm', 'comb', tip, wrist)
}

/** The rod's origin is its outer end; it reaches back into the arm. */
function slidingArm(design: Design, assembly: Assembly): void {
  const { genome, base } = design
  const [armM, rodM] = [genome.links[0]!, genome.links[1]!]
  const shoulder = told(design, (turns) => stretchedArm(genome, base, turns)[0])
  const slide = told(design, (turns) => stretchedArm(genome, base, turns)[1])
  const turn = shoulder(0)
  assembly.link('arm', base, turn, [['arm', [0, 0], [armM, 0]]], { motorAtM: [0.1, 0], turnedBy: 0 })
  const bars: [string, Place, Place][] = [['rod', [-rodM, 0], [0, 0]], ...combBars(genome, [0, 0])]
  assembly.link('rod', along(base, turn, armM + slide(0)), turn, bars)
  assembly.hinge('shoulder', 'intake', 'arm', base, shoulder)
  assembly.slider('slide', 'arm', 'rod', [armM, 0], strokeOf(genome), slide)
}

/** The four bars in this part of the cycle. */
function fourBars(genome: RakeGenome, base: Place, turns: number) {
  const pin = along(base, genome.rockerPinAngle[0]! * degree, genome.rockerPin[0]!)
  const crankEnd = along(base, crankTurn(turns), genome.crank[0]!)
  const meet = meetingPoint(crankEnd, genome.links[0]!, pin, genome.rocker[0]!)
  return {
    pin,
    crankEnd,
    couplerTurn: atan2(meet[1] - crankEnd[1], meet[0] - crankEnd[0]),
    rockerTurn: atan2(meet[1] - pin[1], meet[0] - pin[0]),
  }
}

/** The coupler reaches on beyond the rocker's pin to the comb. */
function crankMachine(design: Design, assembly: Assembly): void {
  const { genome, base, start } = design
  const [crankM, couplerM, rockerM] = [genome.crank[0]!, genome.links[0]!, genome.rocker[0]!]
  const { pin, crankEnd, couplerTurn, rockerTurn } = fourBars(genome, base, start)
  const tip: Place = [couplerM + genome.links[1]!, 0]
  const turn = told(design, crankTurn)
  assembly.link('crank', base, crankTurn(start), [['crank', [0, 0], [crankM, 0]]], { turnedBy: 0 })
  assembly.link('coupler', crankEnd, couplerTurn, [['coupler', [0, 0], tip], ...combBars(genome, tip)])
  assembly.link('rocker', pin, rockerTurn, [['rocker', [0, 0], [rockerM, 0]]])
  assembly.hinge('crank pin', 'intake', 'crank', base, turn)
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

/** A rake is parked with its comb as high as its cycle takes it (to a twenty-fourth of the cycle). */
const parkingPlaces = 24

function parkedAt(genome: RakeGenome, base: Place): number {
  const { combAt } = kinds[layoutOf(genome)]
  let best = 0
  let highestM = Number.NEGATIVE_INFINITY
  for (let k = 0; k < parkingPlaces; k++) {
    const y = combAt(genome, base, k / parkingPlaces)[1]
    if (y <= highestM) continue
    highestM = y
    best = k / parkingPlaces
  }
  return best
}

/** The machine parked, its motors as strong as given (1 for as their class says). */
export function buildMachine(genome: RakeGenome, strengths: readonly number[] = [1, 1, 1]): Machine {
  const assembly = new Assembly(genome, strengths)
  const base: Place = [genome.baseX[0]!, genome.baseY[0]!]
  kinds[layoutOf(genome)].build({ genome, base, start: parkedAt(genome, base) }, assembly)
  const { bodies, joints, driven, outlines } = assembly
  return { bodies, joints, driven, outlines }
}
