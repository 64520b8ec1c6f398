// From a description (spec.ts) to flat arrays (layout.ts): the control plane. Everything is checked here once
// (build-checks.ts), so that the kernel need not look.

import { checkSpec, demand, dimensionsOf } from './build-checks.js'
import {
  doubles,
  layOutContact,
  layOutDrive,
  layOutDriven,
  layOutFills,
  layOutFluid,
  layOutFriction,
  layOutGround,
  layOutGuided,
  layOutPairs,
  layOutPrescribed,
  layOutSensors,
  layOutStruts,
  startPrescribed,
  strokesOf,
} from './build-parts.js'
import type { Lattice, Source } from './layout.js'
import { drivenLimits } from './limits.js'
import type { LatticeSpec } from './spec.js'
import { boundOf, type StepBound, stepRows, stepSafety } from './stability.js'

export type { Lattice } from './layout.js'

/**
 * Checks a description and lays it out. Throws a Refusal ('impossible-value') naming the field, so the node or strut;
 * also where the step is not stable or the body does not hang together.
 */
export function buildLattice(spec: LatticeSpec): Lattice {
  checkSpec(spec)
  const rows = stepRows(spec)
  const limits = drivenLimits(spec)
  const strokes = strokesOf(spec, limits)
  const h = stepOf(spec, boundOf(spec, rows))
  const dimensions = dimensionsOf(spec)
  const stride = 3 * dimensions
  const fixed = new Set((spec.prescribed ?? []).map((path) => path.node))
  const groupCount = Math.max(spec.groups?.length ?? 0, spec.guided ? 1 : 0)
  // A drive that neither waits nor grows is at work from the first step.
  const atOnce = !spec.drive || (spec.drive.startSeconds < h / 2 && spec.drive.rampSeconds < h / 2)
  const parts = {
    dimensions,
    stride,
    nodeCount: spec.nodes.length,
    groupCount,
    nodes: layOutNodes(spec, stride),
    touching: new Float64Array(spec.nodes.length),
    rotors: pairs(groupCount, 0, 1),
    driven: pairs(groupCount, 0, atOnce ? 1 : 0),
    step: 0,
    dragNspm: spec.dragNspm ?? 0,
    inverseMass: doubles(spec.nodes, (n, i) => (n.pinned || fixed.has(i) ? 0 : 1 / n.massKg)),
    massKg: doubles(spec.nodes, (n) => n.massKg),
    gravity: Float64Array.from(spec.gravityMps2),
    friction: layOutFriction(spec),
    heading: dimensions === 3 ? headings(spec, stride) : new Int32Array(0),
    ...layOutStruts(spec),
    ...layOutDriven(spec, strokes, limits),
    ...layOutGuided(spec, h, limits),
    ...layOutSensors(spec, h),
    ...layOutFluid(spec),
    ...layOutFills(spec),
    ...layOutPairs(spec),
    ...layOutGround(spec.ground, dimensions),
    contact: layOutContact(spec.contact),
    depthLimitM: spec.contact?.depthLimitM ?? Number.POSITIVE_INFINITY,
    ...layOutDrive(spec, groupCount, h),
    ...layOutPrescribed(spec),
    stepSeconds: h,
  }
  if (atOnce) startPrescribed(parts)
  const { nodes, rotors, rotation, driven } = parts
  const start = {
    nodes: nodes.slice(),
    rotors: rotors.slice(),
    rotation: rotation.slice(),
    driven: driven.slice(),
  }
  const source: Source = { spec, start, strokes, ...rows }
  return { ...parts, source }
}

/** `count` times the two numbers. */
function pairs(count: number, first: number, second: number): Float64Array {
  return Float64Array.from({ length: 2 * count }, (_, i) => (i % 2 === 0 ? first : second))
}

function layOutNodes(spec: LatticeSpec, stride: number): Float64Array {
  const nodes = new Float64Array(spec.nodes.length * stride)
  for (let i = 0; i < spec.nodes.length; i++) {
    const { positionM, velocityMps } = spec.nodes[i]!
    for (let axis = 0; axis < positionM.length; axis++) {
      nodes[i * stride + axis] = positionM[axis]!
      if (velocityMps) nodes[i * stride + stride / 3 + axis] = velocityMps[axis]!
    }
  }
  return nodes
}

function headings(spec: LatticeSpec, stride: number): Int32Array {
  return Int32Array.from(spec.nodes, ({ headingNode }) =>
    headingNode === undefined ? -1 : headingNode * stride,
  )
}

/** The step asked for, if it is stable; or the longest safe one. */
function stepOf(spec: LatticeSpec, bound: StepBound): number {
  if (spec.stepSeconds === 'auto') {
    const isBounded = bound.limitSeconds < Number.POSITIVE_INFINITY
    demand(isBounded, 'stepSeconds', 'auto', 'a number: nothing here limits the step')
    return stepSafety * bound.limitSeconds
  }
  const h = spec.stepSeconds
  demand(Number.isFinite(h) && h > 0, 'stepSeconds', h, "a finite time above 0, or 'auto'")
  demandStable(h, bound)
  return h
}

/** Throws a Refusal ('impossible-value') with the numbers, unless the step is stable for the linear system. */
export function demandStable(stepSeconds: number, bound: StepBound): void {
  demand(
    stepSeconds < bound.limitSeconds,
    'stepSeconds',
    `${stepSeconds} s`,
    `a step below ${bound.limitSeconds} s: the highest frequency is at most ${bound.highestRadps} rad/s ` +
      `with damping ratio ${bound.dampingRatio}, at node ${bound.node}`,
  )
}
