// Which lattices may lie side by side in the lanes of one kernel: those of the same body. Lists, counts, step and the
// times of the drive must be the same; state, ground, friction, drive and parts may differ.

import { refuse } from '../../../shared/refusals.js'
import type { Lattice } from '../layout.js'

const sameNumbers = [
  'dimensions', 'nodeCount', 'passiveCount', 'activeCount', 'guidedCount', 'sensorCount', 'dragCount', 'fillCount',
  'apartCount', 'groupCount', 'prescribedCount', 'step', 'stepSeconds', 'driveStartStep', 'rampSteps',
] as const // biome-ignore format: one glance

const sameLists = [
  'ends', 'group', 'heading', 'feedbackFirst', 'feedbackSensor', 'sensorKind', 'sensorAt', 'dragEnds', 'fillEnds',
  'apartEnds', 'prescribedEnds', 'prescribedGroup',
] as const // biome-ignore format: one glance

/** Values that the kernel keeps once for all lanes where they agree. */
const material = [
  'inverseMass', 'stiffnessNpm', 'stiffnessRestN', 'dampingNspm', 'limitN', 'powerMostW', 'dragNormal',
  'dragDifference', 'fillRest', 'fillStiffness', 'apartStiffnessNpm', 'apartStiffnessLeastN',
] as const // biome-ignore format: one glance

type Numbers = Float64Array | Int32Array

function equal(a: Numbers, b: Numbers): boolean {
  return a === b || (a.length === b.length && a.every((value, i) => Object.is(value, b[i])))
}

/** Throws a Refusal ('impossible-value') that names the first lattice and field that is not of the body. */
export function demandOneBody(lattices: readonly Lattice[], most: number): void {
  const [first] = lattices
  if (first === undefined || lattices.length > most) {
    throw refuse('impossible-value', {
      detail: `found ${lattices.length} lattices, expected 1 to ${most} that go side by side.`,
      where: { field: 'lattices' },
    })
  }
  for (const [i, lattice] of lattices.entries()) {
    for (const field of sameNumbers) {
      if (lattice[field] !== first[field]) throw other(i, field, lattice[field], first[field])
    }
    for (const field of sameLists) {
      if (!equal(lattice[field], first[field]))
        throw other(i, field, 'another list', 'the list of the first one')
    }
    if (lattice.contact[2] !== first.contact[2]) throw other(i, 'contact', 'another exponent', 'the same one')
    const held = lattice.inverseMass.findIndex((m, node) => (m === 0) !== (first.inverseMass[node] === 0))
    if (held >= 0) throw other(i, `inverseMass[${held}]`, 'a node held', 'the same nodes held in all')
  }
}

function other(i: number, field: string, found: unknown, expected: unknown) {
  return refuse('impossible-value', {
    detail: `found ${String(found)}, expected ${String(expected)}: only lattices of one body at one time go side by side.`,
    where: { field: `lattices[${i}].${field}` },
  })
}

/** Whether some material value is not the same in all lanes. */
export function hasOwnMaterial(lattices: readonly Lattice[]): boolean {
  return lattices.some((lattice) => material.some((field) => !equal(lattice[field], lattices[0]![field])))
}
