// The intake: what stands still, what the water brings, and everything else that is drawn for one simulation. Origin at
// the foot of the screen; the water flows towards +x.

import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import type { Stream } from '../../../shared/streams.js'
import type { BodySpec, MaterialSpec, ShapeSpec } from '../../rigid/spec.js'
import { lipM, numbers } from './numbers.js'

export interface Piece {
  readonly kind: 'branch' | 'plank' | 'clump'
  /** Along and half across, or radius twice. */
  readonly halfM: readonly [number, number]
  /** Size across the channel. */
  readonly depthM: number
  readonly densityKgpm3: number
  readonly friction: number
  readonly positionM: readonly [number, number]
  readonly turn: number
}

export interface IntakeCondition {
  readonly barFriction: number
  readonly flowMps: number
  readonly waterM: number
  /** Strength of each motor against its class. */
  readonly strengths: readonly number[]
  readonly pieces: readonly Piece[]
}

/** Half sizes (along, across) of a kind of piece, from two numbers of 0 to 1. */
const kinds: { readonly [kind in Piece['kind']]: (a: number, b: number) => readonly [number, number] } = {
  branch: (a, b) => [0.05 + 0.07 * a, 0.015 + 0.015 * b],
  plank: (a, b) => [0.05 + 0.05 * a, 0.015 + 0.02 * b],
  clump: (a) => [0.035 + 0.035 * a, 0.035 + 0.035 * a],
}

/**
 * 5 to 9 branches, planks and clumps of leaves, 700 to 1050 kg/m^3 (wood that is or is not full of water), in front of
 * the screen below the water line; water 0.75 to 0.95 m deep at 0.2 to 0.5 m/s; friction of wet debris on bars 0.25 to
 * 0.5; motors at 0.85 to 1.05 of their class. Ranges assumed.
 */
export function drawIntake(stream: Stream): IntakeCondition {
  const between = (low: number, high: number) => low + stream.uniform() * (high - low)
  const barFriction = between(0.25, 0.5)
  const flowMps = between(0.2, 0.5)
  const waterM = between(0.75, 0.95)
  const strengths = Array.from({ length: 3 }, () => between(0.85, 1.05))
  const count = 5 + stream.below(5)
  const names = ['branch', 'plank', 'clump'] as const
  const pieces = Array.from({ length: count }, (_, i): Piece => {
    const kind = names[stream.below(3)]!
    const halfM = kinds[kind](stream.uniform(), stream.uniform())
    // One place each along the screen, so that no two begin inside each other.
    const y = 0.1 + ((i + stream.uniform() * 0.6) / count) * (waterM - 0.2)
    const face = (y * cos(numbers.screenAngle)) / sin(numbers.screenAngle)
    return {
      kind,
      halfM,
      depthM: between(0.15, 0.4),
      densityKgpm3: between(700, 1050),
      friction: between(0.4, 0.7),
      positionM: [face - between(0.16, 0.3) - (i % 2) * 0.25, y],
      turn: between(-Math.PI, Math.PI),
    }
  })
  return { barFriction, flowMps, waterM, strengths, pieces }
}

export const massOfPiece = (piece: Piece) => areaOf(piece) * piece.depthM * piece.densityKgpm3

/** Area of the section, m^2. */
export function areaOf({ kind, halfM: [along, across] }: Piece): number {
  if (kind === 'plank') return 4 * along * across
  if (kind === 'clump') return 1.5 * Math.sqrt(3) * along * along
  return 4 * (along - across) * across + Math.PI * across * across
}

/** Corners of a clump: a regular hexagon. */
export function clumpCorners(radiusM: number): [number, number][] {
  return Array.from({ length: 6 }, (_, i) => [
    radiusM * cos((i * Math.PI) / 3),
    radiusM * sin((i * Math.PI) / 3),
  ])
}

function shapeOf(piece: Piece): ShapeSpec {
  const { kind, halfM, depthM, densityKgpm3, friction } = piece
  const material = { friction, density: densityKgpm3 * depthM }
  const [along, across] = halfM
  if (kind === 'plank') return { outline: { kind: 'box', halfM }, material, layer: 'debris' }
  if (kind === 'clump') {
    return { outline: { kind: 'hull', pointsM: clumpCorners(along) }, material, layer: 'debris' }
  }
  // A capsule lies along its own y axis.
  const outline = { kind: 'capsule', halfLengthM: along - across, radiusM: across } as const
  return { outline, turn: Math.PI / 2, material, layer: 'debris' }
}

export function debrisBodies(pieces: readonly Piece[]): BodySpec[] {
  return pieces.map((piece, i) => ({
    name: `${piece.kind} ${i + 1}`,
    positionM: piece.positionM,
    turn: piece.turn,
    shapes: [shapeOf(piece)],
  }))
}

type Place = readonly [number, number]
const half = numbers.barThicknessM / 2

export const apronEndM: Place = [
  lipM[0] + numbers.apronLengthM * cos(numbers.apronAngle),
  lipM[1] - numbers.apronLengthM * sin(numbers.apronAngle),
]
const troughFloorM = apronEndM[1] - numbers.troughDepthM
const troughEndM = apronEndM[0] + numbers.troughLengthM

/** A straight plate as thick as the bars, by the middle line of its thickness. */
export interface Plate {
  readonly layer: 'bars' | 'deck'
  readonly from: Place
  readonly to: Place
  readonly turn: number
}

/** A plate whose upper left face runs from one place to another. */
function below(layer: Plate['layer'], from: Place, to: Place, turn: number): Plate {
  const [x, y] = [half * sin(turn), -half * cos(turn)]
  return { layer, from: [from[0] + x, from[1] + y], to: [to[0] + x, to[1] + y], turn }
}
const level = (y: number, from: number, to: number) => below('deck', [from, y], [to, y], 0)
const upright = (x: number, from: number, to: number): Plate => {
  return { layer: 'deck', from: [x, from], to: [x, to], turn: Math.PI / 2 }
}

/** Screen, apron, floor and two walls of the trough, channel floor. */
export const plates: readonly Plate[] = [
  below('bars', [0, 0], lipM, numbers.screenAngle),
  below('deck', lipM, apronEndM, -numbers.apronAngle),
  level(troughFloorM, apronEndM[0] - 0.1, troughEndM + 0.1),
  upright(troughEndM + half, troughFloorM, troughFloorM + 0.8),
  upright(apronEndM[0] - half, troughFloorM - 0.1, troughFloorM + 0.3),
  level(0, -3, 0),
]

/** All that stands still, as one body. Tines pass between the bars. */
export function standing(barFriction: number): BodySpec {
  const material: MaterialSpec = { friction: barFriction, density: 0 }
  const shapes = plates.map(({ layer, from, to, turn }): ShapeSpec => {
    const [dx, dy] = [to[0] - from[0], to[1] - from[1]]
    const halfM = [Math.sqrt(dx * dx + dy * dy) / 2, half]
    const atM = [(from[0] + to[0]) / 2, (from[1] + to[1]) / 2]
    return { outline: { kind: 'box', halfM }, atM, turn, material, layer }
  })
  return { name: 'intake', fixed: true, positionM: [0, 0], shapes }
}

/**
 * Pairs that pass through each other: parts of the machine; tines and bars; arms and debris, because a tube of 40 mm in
 * a channel of 500 mm is no shovel (in a side view it would be a plate as wide as the channel).
 */
export const apart: readonly (readonly [string, string])[] = [
  ['arms', 'arms'],
  ['arms', 'beam'],
  ['arms', 'tines'],
  ['arms', 'debris'],
  ['beam', 'tines'],
  ['tines', 'tines'],
  ['tines', 'bars'],
]

/** Lines for the replay. */
export const walls = {
  screen: [0, 0, ...lipM],
  apron: [...lipM, ...apronEndM],
  trough: [
    ...[apronEndM[0], apronEndM[1]],
    ...[apronEndM[0], troughFloorM],
    ...[troughEndM, troughFloorM],
    ...[troughEndM, troughFloorM + 0.8],
  ],
} as const
