// From a description (spec.ts) to numbered unknowns and flat bars. Everything is checked here once.
//
// Unknowns, node by node: displacement x, y of the node, then its rotations (only those that a welded bar or a hinge
// uses). Nodes between just two bars come first, the others follow, each in their order: equations of walls in pieces
// are then solved at little more cost than those of whole walls. A periodic framework has three more at the end, the mean strains e11, e22, e12 (tensor
// components, symmetric: the cell as a whole does not turn). End b of a bar that leaves the cell moves by the
// displacement of its node plus the mean strain times the bar's shift vector R:
//   (e11 Rx + e12 Ry, e12 Rx + e22 Ry)
// which is exact for finite strain too.

import { refuse } from '../../shared/refusals.js'
import type { BarSpec, FrameworkSpec, Point } from './spec.js'

export interface Bar {
  /** Unknowns: ax, ay, turn a, bx, by, turn b; -1 for the rotations of a pin-jointed bar. */
  readonly unknowns: readonly [number, number, number, number, number, number]
  /** From a to b, undeformed. */
  readonly alongM: Point
  readonly lengthM: number
  /** What end b is away from its node in the cell; zero unless the bar leaves the cell. */
  readonly shiftM: Point
  readonly axialN: number
  readonly bendingNm2: number
  /** 12 EI / (kappa G A L^2); 0 for Euler-Bernoulli. */
  readonly shearRatio: number
  readonly massKgpm: number
  readonly rotaryKgm: number
}

export interface Hinge {
  readonly unknowns: readonly [number, number]
  readonly stiffnessNmprad: number
}

export interface Framework {
  readonly unknownCount: number
  /** First unknown (x) of every node; y is the next one. */
  readonly nodeUnknown: Int32Array
  /** 1 where an unknown is a displacement, 0 where it is a rotation or a mean strain. */
  readonly isDisplacement: Uint8Array
  /** Place of the first of the three mean strains; -1 where the framework is not periodic. */
  readonly meanStrain: number
  readonly bars: readonly Bar[]
  readonly hinges: readonly Hinge[]
  /** Area of the cell, m^2; 0 where the framework is not periodic. */
  readonly cellAreaM2: number
  /** What corrections are measured against: side of a square as large as the cell, or of the box round the nodes, m. */
  readonly sizeM: number
  /** Unknown of a rotation of a node; -1 when nothing uses it. */
  readonly turnOf: (node: number, turn?: number) => number
}

/** Checks a description and numbers its unknowns. Throws a Refusal ('impossible-value') naming the field. */
export function buildFramework(spec: FrameworkSpec): Framework {
  checkSpec(spec)
  const numbering = numberUnknowns(spec)
  const periods = spec.periods
  const bars = spec.bars.map((bar, i) => layOutBar(spec, bar, i, numbering))
  const isDisplacement = new Uint8Array(numbering.count + (periods ? 3 : 0))
  for (const first of numbering.nodeUnknown) isDisplacement.fill(1, first, first + 2)
  const [a1, a2] = periods ?? [
    [0, 0],
    [0, 0],
  ]
  return {
    unknownCount: numbering.count + (periods ? 3 : 0),
    nodeUnknown: numbering.nodeUnknown,
    isDisplacement,
    meanStrain: periods ? numbering.count : -1,
    bars,
    hinges: (spec.hinges ?? []).map(({ node, turns, stiffnessNmprad }) => ({
      unknowns: [numbering.turnOf(node, turns[0]), numbering.turnOf(node, turns[1])],
      stiffnessNmprad,
    })),
    cellAreaM2: Math.abs(a1[0] * a2[1] - a1[1] * a2[0]),
    sizeM: periods ? Math.sqrt(Math.abs(a1[0] * a2[1] - a1[1] * a2[0])) : extentM(spec.nodes),
    turnOf: numbering.turnOf,
  }
}

function extentM(nodes: readonly Point[]): number {
  let extent = 0
  for (const axis of [0, 1] as const) {
    const low = nodes.reduce((least, node) => Math.min(least, node[axis]), Number.POSITIVE_INFINITY)
    const high = nodes.reduce((most, node) => Math.max(most, node[axis]), Number.NEGATIVE_INFINITY)
    extent = Math.max(extent, high - low)
  }
  return extent
}

interface Numbering {
  readonly count: number
  readonly nodeUnknown: Int32Array
  readonly turnOf: (node: number, turn?: number) => number
}

function numberUnknowns({ nodes, bars, hinges = [] }: FrameworkSpec): Numbering {
  const turns = nodes.map(() => new Set<number>())
  for (const { a, b, bendingNm2 = 0, turnA = 0, turnB = 0 } of bars) {
    if (bendingNm2 > 0) {
      turns[a]!.add(turnA)
      turns[b]!.add(turnB)
    }
  }
  for (const hinge of hinges) for (const turn of hinge.turns) turns[hinge.node]!.add(turn)
  const meeting = new Int32Array(nodes.length)
  for (const { a, b } of bars) {
    meeting[a]!++
    meeting[b]!++
  }
  const inLine = (node: number) => meeting[node] === 2
  const order = [...nodes.keys()]
  const nodeUnknown = new Int32Array(nodes.length)
  const places: Map<number, number>[] = nodes.map(() => new Map())
  let count = 0
  for (const node of [...order.filter(inLine), ...order.filter((one) => !inLine(one))]) {
    nodeUnknown[node] = count
    count += 2
    for (const turn of [...turns[node]!].sort((p, q) => p - q)) places[node]!.set(turn, count++)
  }
  return { count, nodeUnknown, turnOf: (node, turn = 0) => places[node]?.get(turn) ?? -1 }
}

function layOutBar(spec: FrameworkSpec, bar: BarSpec, index: number, numbering: Numbering): Bar {
  const { a, b, shift = [0, 0], axialN, bendingNm2 = 0, shearN, massKgpm = 0, rotaryKgm = 0 } = bar
  const [a1, a2] = spec.periods ?? [
    [0, 0],
    [0, 0],
  ]
  const shiftM: Point = [shift[0] * a1[0] + shift[1] * a2[0], shift[0] * a1[1] + shift[1] * a2[1]]
  const [from, to] = [spec.nodes[a]!, spec.nodes[b]!]
  const alongM: Point = [to[0] + shiftM[0] - from[0], to[1] + shiftM[1] - from[1]]
  const lengthM = Math.sqrt(alongM[0] * alongM[0] + alongM[1] * alongM[1])
  demand(lengthM > 0, `bars[${index}]`, 'both ends at one place', 'a length above 0')
  const welded = bendingNm2 > 0
  const at = numbering.nodeUnknown
  return {
    unknowns: [
      at[a]!,
      at[a]! + 1,
      welded ? numbering.turnOf(a, bar.turnA) : -1,
      at[b]!,
      at[b]! + 1,
      welded ? numbering.turnOf(b, bar.turnB) : -1,
    ],
    alongM,
    lengthM,
    shiftM,
    axialN,
    bendingNm2,
    shearRatio: shearN ? (12 * bendingNm2) / (shearN * lengthM * lengthM) : 0,
    massKgpm,
    rotaryKgm,
  }
}

function demand(truth: boolean, field: string, found: unknown, expected: string): asserts truth {
  if (!truth) {
    throw refuse('impossible-value', {
      detail: `found ${String(found)}, expected ${expected}.`,
      where: { field: `framework.${field}` },
    })
  }
}

const isPositive = (x: number) => Number.isFinite(x) && x > 0
const isAtLeast0 = (x: number) => Number.isFinite(x) && x >= 0

function checkSpec({ nodes, bars, hinges = [], periods }: FrameworkSpec): void {
  const isNode = (i: number) => Number.isInteger(i) && i >= 0 && i < nodes.length
  const aNode = `a node, 0 to ${nodes.length - 1}`
  for (const [i, point] of nodes.entries()) {
    demand(point.length === 2 && point.every(Number.isFinite), `nodes[${i}]`, point, '2 finite numbers')
  }
  demand(bars.length > 0, 'bars', 'none', 'at least one bar')
  for (const [i, bar] of bars.entries()) {
    const at = `bars[${i}]`
    demand(isNode(bar.a), `${at}.a`, bar.a, aNode)
    demand(isNode(bar.b), `${at}.b`, bar.b, aNode)
    demand(isPositive(bar.axialN), `${at}.axialN`, bar.axialN, 'a finite stiffness above 0')
    for (const field of ['bendingNm2', 'massKgpm', 'rotaryKgm'] as const) {
      demand(isAtLeast0(bar[field] ?? 0), `${at}.${field}`, bar[field], 'a finite number of at least 0')
    }
    demand(bar.shearN === undefined || isPositive(bar.shearN), `${at}.shearN`, bar.shearN, 'above 0')
    const shift = bar.shift ?? [0, 0]
    demand(shift.every(Number.isInteger), `${at}.shift`, shift, 'two whole numbers')
    demand(periods !== undefined || !bar.shift, `${at}.shift`, shift, 'no shift, or periods')
  }
  for (const [i, hinge] of hinges.entries()) {
    demand(isNode(hinge.node), `hinges[${i}].node`, hinge.node, aNode)
    demand(isAtLeast0(hinge.stiffnessNmprad), `hinges[${i}]`, hinge.stiffnessNmprad, 'a number of at least 0')
  }
  if (periods) {
    const [[ux, uy], [vx, vy]] = periods
    const area = Math.abs(ux * vy - uy * vx)
    demand(isPositive(area), 'periods', JSON.stringify(periods), 'two periods that span an area')
  }
}
