// The intake: what stands still, what the water brings, and everything else that is drawn for one simulation. Origin at
// the foot of the screen; the water flows towards +x.

import { atan2 } from '../../../shared/detmath/inverse-trigonometry.js'
import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import type { Stream } from '../../../shared/streams.js'
import type { BodySpec, MaterialSpec, ShapeSpec } from '../../rigid/spec.js'
import { bendM, bendStartM, lipM, numbers } from './numbers.js'

/** A bundle of debris, seen along the bars' tops: a disc. */
export interface Piece {
  readonly kind: 'branches' | 'leaves'
  readonly radiusM: number
  /** Size across the channel. */
  readonly depthM: number
  readonly densityKgpm3: number
  readonly friction: number
  readonly positionM: readonly [number, number]
}

export interface IntakeCondition {
  readonly barFriction: number
  readonly flowMps: number
  readonly waterM: number
  /** Strength of each motor against its class. */
  readonly strengths: readonly number[]
  readonly pieces: readonly Piece[]
}

/** Radii of a kind of piece, m. */
const radii: { readonly [kind in Piece['kind']]: readonly [number, number] } = {
  branches: [0.025, 0.045],
  leaves: [0.035, 0.07],
}

/**
 * 4 bundles of branches or leaves, full of water (1000 to 1080 kg/m^3: they neither rise by themselves nor sink fast),
 * lying on the screen below the water line; water 0.75 to 0.95 m deep at 0.2 to 0.5 m/s; friction of wet debris on bars
 * 0.4 to 0.6 (mean of the two coefficients drawn); motors at 0.85 to 1.05 of their class. Ranges assumed.
 */
export function drawIntake(stream: Stream): IntakeCondition {
  const between = (low: number, high: number) => low + stream.uniform() * (high - low)
  const barFriction = between(0.3, 0.5)
  const flowMps = between(0.2, 0.5)
  const waterM = between(0.75, 0.95)
  const strengths = Array.from({ length: 3 }, () => between(numbers.strengthLeast, numbers.strengthMost))
  const pieces = Array.from({ length: numbers.pieces }, (_, i): Piece => {
    const kind = stream.below(2) === 0 ? 'branches' : 'leaves'
    const radiusM = between(...radii[kind])
    // One place each along the screen, so that no two begin inside each other.
    const y = 0.1 + ((i + stream.uniform() * 0.6) / numbers.pieces) * (waterM - 0.2)
    const face = (y * cos(numbers.screenAngle)) / sin(numbers.screenAngle)
    return {
      kind,
      radiusM,
      depthM: between(0.15, 0.4),
      densityKgpm3: between(1000, 1080),
      friction: between(0.5, 0.7),
      positionM: [face - (radiusM + 0.01) / sin(numbers.screenAngle), y],
    }
  })
  return { barFriction, flowMps, waterM, strengths, pieces }
}

export const volumeOf = ({ radiusM, depthM }: Piece) => Math.PI * radiusM * radiusM * depthM
export const massOfPiece = (piece: Piece) => volumeOf(piece) * piece.densityKgpm3

export function debrisBodies(pieces: readonly Piece[]): BodySpec[] {
  return pieces.map(({ kind, radiusM, depthM, densityKgpm3, friction, positionM }, i) => ({
    name: `${kind} ${i + 1}`,
    positionM,
    shapes: [
      {
        outline: { kind: 'ball', radiusM },
        material: { friction, density: densityKgpm3 * depthM },
        layer: 'debris',
      },
    ],
    extra: { massKg: 1e-6, centreM: [0, 0], inertiaKgm2: numbers.pieceInertiaKgm2 },
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

/** A plate by the middle line of its thickness. */
export interface Plate {
  readonly layer: 'bars' | 'deck'
  readonly from: Place
  readonly to: Place
  readonly turn: number
  /** Half its thickness. */
  readonly halfM: number
}

/** A plate whose upper left face runs from one place to another. */
function below(layer: Plate['layer'], from: Place, to: Place, turn: number): Plate {
  const [x, y] = [half * sin(turn), -half * cos(turn)]
  return { layer, from: [from[0] + x, from[1] + y], to: [to[0] + x, to[1] + y], turn, halfM: half }
}
const level = (y: number, from: number, to: number) => below('deck', [from, y], [to, y], 0)

/** Straight piece of the screen, apron, floor of the trough, channel floor. */
const straightPlates: readonly Plate[] = [
  below('bars', [0, 0], bendStartM, numbers.screenAngle),
  below('bars', lipM, apronEndM, -numbers.apronAngle),
  level(troughFloorM, apronEndM[0], troughEndM),
  level(0, -3, 0),
]
/** The bend, told by its middle: nothing gets to the rest of the disc behind the bars. */
const bend: Plate = { layer: 'bars', from: bendM, to: bendM, turn: 0, halfM: numbers.bendRadiusM }
export const plates: readonly Plate[] = [...straightPlates, bend]

const wholeBend = numbers.screenAngle + numbers.apronAngle
/** Way along the bars from the foot of the screen to the lip. */
export const lipWayM = numbers.screenLengthM + numbers.bendRadiusM * wholeBend

/**
 * How far along the bars a place is, from the foot of the screen, m: up the straight piece, then round the bend as far
 * as seen from its middle, at most to the lip. It grows all along the way that a piece must go.
 */
export function wayM([px, py]: Place): number {
  const [x, y] = [px - bendM[0], py - bendM[1]]
  const [c, s] = [cos(numbers.screenAngle), sin(numbers.screenAngle)]
  const up = x * c + y * s
  if (x < 0 && up <= 0) return numbers.screenLengthM + up
  const down = x * cos(numbers.apronAngle) - y * sin(numbers.apronAngle)
  if (x >= 0 && down >= 0) return lipWayM
  return numbers.screenLengthM + numbers.bendRadiusM * atan2(up, y * c - x * s)
}

/** All that stands still, as one body. Tines pass between the bars. */
export function standing(barFriction: number): BodySpec {
  const material: MaterialSpec = { friction: barFriction, density: 0 }
  const disc: ShapeSpec = {
    outline: { kind: 'ball', radiusM: bend.halfM },
    atM: bendM,
    material,
    layer: bend.layer,
  }
  const shapes = straightPlates.map(({ layer, from, to, turn }): ShapeSpec => {
    const [dx, dy] = [to[0] - from[0], to[1] - from[1]]
    const halfM = [Math.sqrt(dx * dx + dy * dy) / 2, half]
    const atM = [(from[0] + to[0]) / 2, (from[1] + to[1]) / 2]
    return { outline: { kind: 'box', halfM }, atM, turn, material, layer }
  })
  return { name: 'intake', fixed: true, positionM: [0, 0], shapes: [...shapes, disc] }
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

/** Places between the ends of the bend, for the replay. */
const bendPoints = Array.from({ length: 7 }, (_, i) => {
  const turn = numbers.screenAngle - ((i + 1) / 8) * wholeBend
  return [bendM[0] - numbers.bendRadiusM * sin(turn), bendM[1] + numbers.bendRadiusM * cos(turn)]
}).flat()

/** Lines for the replay. */
export const walls = {
  screen: [0, 0, ...bendStartM, ...bendPoints, ...lipM],
  apron: [...lipM, ...apronEndM],
  trough: [apronEndM[0], troughFloorM, troughEndM, troughFloorM],
} as const
