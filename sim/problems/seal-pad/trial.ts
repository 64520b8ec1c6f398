// One trial of one pad as cast: its cell with this casting's deviations, its moduli at small strain, and the cell
// squeezed to the working strain.

import { type Stream, stream } from '../../../shared/streams.js'
import {
  type BarSpec,
  buildFramework,
  chordOf,
  type Framework,
  type FrameworkSpec,
  homogeniseFramework,
  inPieces,
  type Moduli,
  moduliOf,
  nearestIsotropic,
  type Point,
  placeBar,
  type Squeezed,
  squeeze,
} from '../../frames/index.js'
import { type CellWall, cellOf, type PadCell, pieceOf } from './cell.js'
import { gridLines, type PadGenome, thicknessOfM } from './genome.js'
import { numbers } from './numbers.js'
import { wallsMeet } from './planar.js'

/** What casting does to one pad: every cell of it comes from the same mould, so all cells deviate alike. */
export interface CastingCondition {
  /** How many standard deviations the modulus of this batch of rubber is off. */
  readonly batch: number
  /** Added to the thickness of each wall of the cell, in the order of slots and their four images, m. */
  readonly wallOffsetsM: Float64Array
  /** How far the middle of each wall is out of line, in the same order, m. */
  readonly bowsM: Float64Array
  /** Added to x, y of each of the 16 nodes, m. */
  readonly placeOffsetsM: Float64Array
}

const slots = gridLines.length + 4
const images = 4

/** Normal deviates within two standard deviations for tolerances, within three for the modulus. */
export function drawCasting(stream: Stream): CastingCondition {
  const within = (most: number) => Math.min(most, Math.max(-most, stream.normal()))
  const batch = within(3)
  const wallOffsetsM = Float64Array.from(
    { length: slots * images },
    () => (numbers.wallToleranceM / 2) * within(2),
  )
  const bowsM = Float64Array.from({ length: slots * images }, () => (numbers.bowToleranceM / 2) * within(2))
  const placeOffsetsM = Float64Array.from({ length: 32 }, () => (numbers.placeToleranceM / 2) * within(2))
  return { batch, wallOffsetsM, bowsM, placeOffsetsM }
}

/** A casting without any deviation. */
export const perfectCasting: CastingCondition = {
  batch: 0,
  wallOffsetsM: new Float64Array(slots * images),
  bowsM: new Float64Array(slots * images),
  placeOffsetsM: new Float64Array(32),
}

/** As drawn, but with nodes and walls a little out of line, as every casting has them: to be squeezed. */
export const asDrawn: CastingCondition = {
  ...drawCasting(stream(1, 'spare')),
  batch: 0,
  wallOffsetsM: perfectCasting.wallOffsetsM,
}

/** What belongs to each wall of this casting in a list by slots and images. */
function byWall(walls: readonly CellWall[], values: Float64Array): number[] {
  const seen = new Int32Array(slots)
  return walls.map(({ slot }) => values[images * slot + seen[slot]!++]!)
}

export interface WallOptions {
  /** Walls do not shear (Euler-Bernoulli), as published formulas for honeycombs have it. */
  readonly rigidInShear?: boolean
}

export interface DescribedCell {
  readonly cell: PadCell
  /** One bar a wall, between nodes of the cell as it is numbered in cell.ts, per metre of depth. */
  readonly bars: readonly BarSpec[]
  readonly thicknessM: readonly number[]
  readonly bowsM: readonly number[]
  /** The same as a framework, without nodes that no wall uses. */
  readonly spec: FrameworkSpec
}

/** The cell of a genome as cast. */
export function describeCell(
  genome: PadGenome,
  casting: CastingCondition = perfectCasting,
  { rigidInShear = false }: WallOptions = {},
): DescribedCell {
  const cell = cellOf(genome)
  const { youngPa, youngSpread, poissonRatio: nu } = numbers.rubbers[genome.rubber[0]!]!
  const young = youngPa * (1 + (youngSpread / 3) * casting.batch)
  // Walls are much deeper than thick: they stretch and bend like plates.
  const platePa = young / (1 - nu * nu)
  const shearPa = young / (2 * (1 + nu))
  const offsetsM = byWall(cell.walls, casting.wallOffsetsM)
  const thicknessM = cell.walls.map(({ kind }, i) => thicknessOfM[kind]! + offsetsM[i]!)
  const bars = cell.walls.map(({ a, b, shift }, i): BarSpec => {
    const t = thicknessM[i]!
    const axialN = platePa * t
    const shearN = numbers.shearFactor * shearPa * t
    return { a, b, shift, axialN, bendingNm2: (axialN * t * t) / 12, ...(rigidInShear ? {} : { shearN }) }
  })
  const nodes = cell.nodesM.map(([x, y], i): Point => {
    return [x + casting.placeOffsetsM[2 * i]!, y + casting.placeOffsetsM[2 * i + 1]!]
  })
  const periods = [
    [cell.widthM, 0],
    [0, cell.heightM],
  ] as const
  const bowsM = byWall(cell.walls, casting.bowsM)
  return { cell, bars, thicknessM, bowsM, spec: withoutIdleNodes({ nodes, bars, periods }) }
}

function withoutIdleNodes({ nodes, bars, ...rest }: FrameworkSpec): FrameworkSpec {
  const used = [...new Set(bars.flatMap(({ a, b }) => [a, b]))].sort((p, q) => p - q)
  const place = new Map(used.map((node, i) => [node, i]))
  return {
    ...rest,
    nodes: used.map((node) => nodes[node]!),
    bars: bars.map((bar) => ({ ...bar, a: place.get(bar.a)!, b: place.get(bar.b)! })),
  }
}

export interface SmallStrain {
  readonly described: DescribedCell
  readonly moduli: Moduli
  readonly anisotropy: number
  readonly materialKg: number
  /** Share of the pad that is rubber; joints are counted twice. */
  readonly density: number
}

/** Moduli of one casting at small strain; or why it is no pad. */
export function smallStrain(
  genome: PadGenome,
  casting: CastingCondition,
): SmallStrain | { readonly reason: string } {
  const described = describeCell(genome, casting)
  const { cell, spec, thicknessM } = described
  if (cell.walls.length === 0 || pieceOf(cell.walls, cell.walls[0]!.a).reach < 2) {
    return { reason: 'the pad falls apart: its walls do not hold together both ways' }
  }
  const framework = buildFramework(spec)
  const areaM2 = framework.bars.reduce((sum, bar, i) => sum + bar.lengthM * thicknessM[i]!, 0)
  const density = areaM2 / framework.cellAreaM2
  if (density > numbers.densityMost) {
    return { reason: `${percent(density)} of the pad are walls: no structure` }
  }
  const { stiffness, mechanisms } = homogeniseFramework(framework)
  if (mechanisms > 0) return { reason: `the cell has ${mechanisms} mechanisms: parts of it move freely` }
  const { length, height, depth } = numbers.padM
  const rubber = numbers.rubbers[genome.rubber[0]!]!
  return {
    described,
    moduli: moduliOf(stiffness),
    anisotropy: nearestIsotropic(stiffness).anisotropy,
    materialKg: rubber.densityKgpm3 * density * length * height * depth,
    density,
  }
}

export interface PadTrial extends SmallStrain {
  readonly squeezed: Squeezed
  /** Largest strain of any wall's surface at the working squeeze. */
  readonly wallStrain: number
}

/**
 * Tries one casting, small strain and working squeeze; or says why it is no pad. `finer` cuts walls into so many times
 * as many pieces and takes so many times as many steps.
 */
export function tryPad(
  genome: PadGenome,
  casting: CastingCondition,
  finer = 1,
): PadTrial | { readonly reason: string } {
  const small = smallStrain(genome, casting)
  if ('reason' in small) return small
  const pieces = numbers.squeezePieces * finer
  const spec = inPieces(small.described.spec, pieces, (bar) => small.described.bowsM[bar]!)
  const framework = buildFramework(spec)
  const squeezed = squeeze(framework, {
    axis: 1,
    strain: -numbers.workingSqueeze,
    steps: numbers.squeezeSteps * finer,
    // Hatch and frame, pipe and wall do not slide along each other.
    holdShear: true,
    stableOnly: true,
  })
  if ('reason' in squeezed) return { reason: `${squeezed.reason} by ${percent(-squeezed.along)} squeeze` }
  if (wallsMeet(framework, squeezed.situation.u, spec)) {
    return { reason: `walls meet before ${percent(numbers.workingSqueeze)} squeeze` }
  }
  const rubber = numbers.rubbers[genome.rubber[0]!]!
  const thicknessM = small.described.thicknessM.flatMap((t) => new Array<number>(pieces).fill(t))
  const wallStrain = surfaceStrain(framework, squeezed.situation.u, thicknessM)
  if (wallStrain > rubber.strainMost) {
    return {
      reason: `a wall is strained by ${percent(wallStrain)} at ${percent(numbers.workingSqueeze)} squeeze`,
    }
  }
  return { ...small, squeezed, wallStrain }
}

const percent = (share: number) => `${(100 * share).toFixed(1)} %`

/** Stretch of the middle plus half the thickness times the curvature at the ends (2/L (2 t1 + t2)), the largest. */
function surfaceStrain(framework: Framework, u: Float64Array, thicknessM: readonly number[]): number {
  let largest = 0
  for (const [i, bar] of framework.bars.entries()) {
    const { stretchM, bendA, bendB } = chordOf(bar, placeBar(bar, framework.meanStrain, u))
    const bend = Math.max(Math.abs(2 * bendA + bendB), Math.abs(bendA + 2 * bendB))
    const strain = (Math.abs(stretchM) + thicknessM[i]! * bend) / bar.lengthM
    largest = Math.max(largest, strain)
  }
  return largest
}
