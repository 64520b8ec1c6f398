// Writing a body into the kernel's memory: lists of struts, fills, sensors and so on, with node numbers turned into
// addresses. State and what may change between calls are in state.ts, the ground is in terrain.ts.

import { loadedShare } from '../../../shared/making/measures.js'
import * as header from './header.js'
import { nodeAt, numberPlace, type Pen, putEqual, putMaterial, putWide, putWideRow, putWord } from './pen.js'

/** Everything that stays as it is while the lanes move. */
export function writeBody(pen: Pen): void {
  writeHead(pen)
  writeNodeTable(pen)
  writePassive(pen)
  writeActive(pen)
  writeGuided(pen)
  writeSensors(pen)
  writeDragStruts(pen)
  writeFills(pen)
  writePairs(pen)
  writeGroups(pen)
  writePrescribed(pen)
}

/** Words that hold where a list begins and ends. */
const ranges = [
  ['nodes', header.nodesFirst, header.nodesEnd],
  ['passive', header.passiveFirst, header.passiveEnd],
  ['active', header.activeFirst, header.activeEnd],
  ['guided', header.guidedFirst, header.guidedEnd],
  ['drag', header.dragFirst, header.dragEnd],
  ['fills', header.fillFirst, header.fillEnd],
  ['apart', header.apartFirst, header.apartEnd],
  ['sensors', header.sensorFirst, header.sensorEnd],
  ['groups', header.groupFirst, header.groupEnd],
  ['prescribed', header.prescribedFirst, header.prescribedEnd],
] as const

function writeHead(pen: Pen): void {
  const { places, lanes, variant } = pen
  const [lattice] = lanes as readonly [(typeof lanes)[number]]
  for (const [list, first, end] of ranges) {
    putWord(pen, first, places[list].first)
    putWord(pen, end, places[list].end)
  }
  putWord(pen, header.nodeTable, places.nodeTable.first)
  putWord(pen, header.rowsFirst, places.rows.first)
  const grounded = lanes.some(({ terrain }) => terrain[2]! !== Number.NEGATIVE_INFINITY)
  putWord(pen, header.hasGround, grounded ? 1 : 0)
  putWord(pen, header.rooted, lattice.contact[2]! !== 0 ? 1 : 0)
  putWord(pen, header.rampSteps, lattice.rampSteps)
  putWord(pen, header.freshAt, -1)
  const sweeps = lanes.some(({ sweepSteps }) => sweepSteps.some((steps) => steps > 0))
  putWord(pen, header.sweeping, sweeps ? 1 : 0)
  const limited = lanes.some(({ depthLimitM }) => depthLimitM !== Number.POSITIVE_INFINITY)
  putWord(pen, header.depthLimited, limited ? 1 : 0)
  putWord(pen, header.strutSamples, places.strutSamples.first)
  putWord(pen, header.drivenSamples, places.drivenSamples.first)
  putWord(pen, header.nodeSamples, places.nodeSamples.first)

  const equal = (n: number, value: number) => putEqual(pen, numberPlace(variant, n), value)
  equal(header.oneAt, 1)
  equal(header.twoAt, 2)
  equal(header.halfAt, 0.5)
  equal(header.perSixAt, 1 / 6)
  // Single precision has no 1e-200.
  equal(header.tinyAt, variant.numberBytes === 8 ? 1e-200 : 1e-30)
  equal(header.stepAt, lattice.stepSeconds)
  equal(header.loadedShareAt, loadedShare)
  putWideRow(pen, numberPlace(variant, header.gravityAt), 'gravity', 0, lattice.dimensions)
  putWideRow(pen, numberPlace(variant, header.contactStiffnessAt), 'contact', 0, 2)
}

function writeNodeTable(pen: Pen): void {
  const { sizes, places, lanes, variant } = pen
  const [{ nodeCount, dimensions, heading, inverseMass, sensorCount }] = lanes as readonly [
    (typeof lanes)[number],
  ]
  for (let i = 0; i < nodeCount; i++) {
    const row = places.nodeTable.first + i * sizes.nodeRow
    putMaterial(pen, row, 'inverseMass', i)
    putWideRow(pen, row + sizes.friction, 'friction', dimensions * i, dimensions)
    const ahead = dimensions === 3 ? heading[i]! : -1
    const held = inverseMass[i] === 0
    const words = row + sizes.heading
    putWord(pen, words, ahead < 0 ? 0 : nodeAt(pen, ahead))
    putWord(pen, words + 4, sensorCount > 0 ? places.touching.first + i * variant.wide : 0)
    putWord(pen, words + 8, held ? 2 : sensorCount > 0 ? 1 : 0)
    putWord(pen, words + 12, 0)
  }
}

/** Addresses of both ends of strut i of a list of pairs. */
function putEnds(pen: Pen, at: number, ends: Int32Array, i: number): void {
  putWord(pen, at, nodeAt(pen, ends[2 * i]!))
  putWord(pen, at + 4, nodeAt(pen, ends[2 * i + 1]!))
}

/** Stiffness, stiffness * rest and damping of strut i of the whole list. */
function putLaw(pen: Pen, at: number, i: number): void {
  const step = pen.variant.materialBytes
  putMaterial(pen, at, 'stiffnessNpm', i)
  putMaterial(pen, at + step, 'stiffnessRestN', i)
  putMaterial(pen, at + 2 * step, 'dampingNspm', i)
}

function writePassive(pen: Pen): void {
  const { places, sizes, lanes, variant } = pen
  const [{ passiveCount, ends }] = lanes as readonly [(typeof lanes)[number]]
  for (let i = 0; i < passiveCount; i++) {
    const at = places.passive.first + i * sizes.passive
    putLaw(pen, at, i)
    putEnds(pen, at + 3 * variant.materialBytes, ends, i)
  }
}

function drivenPairAt({ places, sizes, variant }: Pen, group: number): number {
  return places.groups.first + (group / 2) * sizes.group + 2 * variant.wide
}

function writeActive(pen: Pen): void {
  const { places, sizes, lanes, variant } = pen
  const [{ passiveCount, activeCount, ends, group }] = lanes as readonly [(typeof lanes)[number]]
  for (let j = 0; j < activeCount; j++) {
    const at = places.active.first + j * sizes.active
    const words = at + 5 * variant.materialBytes
    putLaw(pen, at, passiveCount + j)
    putMaterial(pen, at + 3 * variant.materialBytes, 'limitN', j)
    putMaterial(pen, at + 4 * variant.materialBytes, 'powerMostW', j)
    putEnds(pen, words, ends, passiveCount + j)
    putWord(pen, words + 8, drivenPairAt(pen, group[j]!))
    putWide(pen, at + sizes.activeStrain, 'strainCos', j)
    putWide(pen, at + sizes.activeStrain + variant.wide, 'strainSin', j)
  }
}

function writeGuided(pen: Pen): void {
  const { places, sizes, lanes, variant } = pen
  const [{ passiveCount, activeCount, guidedCount, ends, group, feedbackFirst }] = lanes as readonly [
    (typeof lanes)[number],
  ]
  for (let j = 0; j < guidedCount; j++) {
    const at = places.guided.first + j * sizes.guided
    const driven = activeCount + j
    putEnds(pen, at, ends, passiveCount + driven)
    putWord(pen, at + 8, drivenPairAt(pen, group[driven]!))
    putWord(pen, at + 12, places.feedback.first + feedbackFirst[j]! * sizes.feedback)
    putWord(pen, at + 16, places.feedback.first + feedbackFirst[j + 1]! * sizes.feedback)
    putLaw(pen, at + 32, passiveCount + driven)
    putMaterial(pen, at + 32 + 3 * variant.materialBytes, 'limitN', driven)
    putMaterial(pen, at + 32 + 4 * variant.materialBytes, 'powerMostW', driven)
    const strain = at + sizes.guidedStrain
    putWide(pen, strain, 'strainCos', driven)
    putWide(pen, strain + variant.wide, 'strainSin', driven)
    putWide(pen, strain + 2 * variant.wide, 'strokeMost', j)
    putWide(pen, strain + 3 * variant.wide, 'strainStepMost', j)
  }
  writeFeedback(pen)
}

function writeFeedback(pen: Pen): void {
  const { places, sizes, lanes, variant } = pen
  const [{ feedbackSensor }] = lanes as readonly [(typeof lanes)[number]]
  for (const [row, sensor] of feedbackSensor.entries()) {
    const at = places.feedback.first + row * sizes.feedback
    putWord(pen, at, places.sensors.first + sensor * sizes.sensor + 16 + 2 * variant.wide)
    putWide(pen, at + 16, 'feedbackGain', row)
  }
}

function writeSensors(pen: Pen): void {
  const { places, sizes, lanes, variant } = pen
  const [{ sensorCount, sensorKind, sensorAt, ends }] = lanes as readonly [(typeof lanes)[number]]
  for (let n = 0; n < sensorCount; n++) {
    const at = places.sensors.first + n * sizes.sensor
    const isStrain = sensorKind[n] !== 0
    const target = sensorAt[n]!
    putWord(pen, at, isStrain ? 1 : 0)
    if (isStrain) {
      putEnds(pen, at + 4, ends, target)
      putWide(pen, at + 16, 'restM', target)
    } else {
      putWord(pen, at + 4, places.touching.first + target * variant.wide)
    }
    putWide(pen, at + 16 + variant.wide, 'sensorRate', n)
  }
}

function writeDragStruts(pen: Pen): void {
  const { places, sizes, lanes, variant } = pen
  const [{ dragCount, dragEnds }] = lanes as readonly [(typeof lanes)[number]]
  for (let i = 0; i < dragCount; i++) {
    const at = places.drag.first + i * sizes.drag
    putEnds(pen, at, dragEnds, i)
    putMaterial(pen, at + sizes.first, 'dragNormal', i)
    putMaterial(pen, at + sizes.first + variant.materialBytes, 'dragDifference', i)
  }
}

function writeFills(pen: Pen): void {
  const { places, sizes, lanes, variant } = pen
  const [{ fillCount, fillEnds, dimensions }] = lanes as readonly [(typeof lanes)[number]]
  for (let n = 0; n < fillCount; n++) {
    const at = places.fills.first + n * sizes.fill
    for (let corner = 0; corner <= dimensions; corner++) {
      putWord(pen, at + 4 * corner, nodeAt(pen, fillEnds[(dimensions + 1) * n + corner]!))
    }
    putMaterial(pen, at + 16, 'fillRest', n)
    putMaterial(pen, at + 16 + variant.materialBytes, 'fillStiffness', n)
  }
}

function writePairs(pen: Pen): void {
  const { places, sizes, lanes, variant } = pen
  const [{ apartCount, apartEnds }] = lanes as readonly [(typeof lanes)[number]]
  for (let i = 0; i < apartCount; i++) {
    const at = places.apart.first + i * sizes.apart
    putEnds(pen, at, apartEnds, i)
    putMaterial(pen, at + sizes.first, 'apartStiffnessNpm', i)
    putMaterial(pen, at + sizes.first + variant.materialBytes, 'apartStiffnessLeastN', i)
  }
}

function writeGroups(pen: Pen): void {
  const { places, sizes, lanes, variant, engine } = pen
  const [{ groupCount }] = lanes as readonly [(typeof lanes)[number]]
  for (let g = 0; g < groupCount; g++) {
    const at = places.groups.first + g * sizes.group
    putWideRow(pen, at + 6 * variant.wide, 'rotationTurn', 2 * g, 2)
    const sweep = (at + 12 * variant.wide) / variant.numberBytes
    for (const [lane, { sweepSteps }] of lanes.entries()) engine.numbers[sweep + lane] = sweepSteps[g]!
    putEqual(pen, at + 13 * variant.wide, 0)
  }
}

function writePrescribed(pen: Pen): void {
  const { places, sizes, lanes, variant } = pen
  const [{ prescribedCount, prescribedEnds, prescribedGroup, dimensions }] = lanes as readonly [
    (typeof lanes)[number],
  ]
  for (let n = 0; n < prescribedCount; n++) {
    const at = places.prescribed.first + n * sizes.prescribed
    putWord(pen, at, nodeAt(pen, prescribedEnds[n]!))
    putWord(pen, at + 4, drivenPairAt(pen, prescribedGroup[n]!))
    const span = dimensions * variant.wide
    putWideRow(pen, at + 16 + span, 'prescribedAmplitudeM', dimensions * n, dimensions)
    putWide(pen, at + 16 + 2 * span, 'prescribedCos', n)
    putWide(pen, at + 16 + 2 * span + variant.wide, 'prescribedSin', n)
  }
}
