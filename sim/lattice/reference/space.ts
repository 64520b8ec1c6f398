// Steps of a lattice in space: the order of everything (layout.ts). Arrays are read off the lattice once a call.

import type { Lattice } from '../layout.js'
import { movePrescribed, turnDrive } from './drive.js'
import { addVolumes } from './fills.js'
import { guide } from './guide.js'
import { integrateSpace } from './space-nodes.js'
import {
  addActiveSpace,
  addApartSpace,
  addDragSpace,
  addGuidedSpace,
  addPassiveSpace,
} from './space-struts.js'

/** Forces of everything but node drag, contact and friction, added to the force fields. */
export function addForcesSpace(lattice: Lattice): void {
  const {
    passiveCount,
    activeCount,
    ends,
    stiffnessNpm: k,
    stiffnessRestN: kL,
    dampingNspm: c,
    nodes,
  } = lattice
  const { group, strainCos, strainSin, limitN, powerMostW, driven } = lattice
  addPassiveSpace(passiveCount, ends, k, kL, c, nodes)
  addActiveSpace(
    passiveCount,
    activeCount,
    ends,
    k,
    kL,
    c,
    group,
    strainCos,
    strainSin,
    limitN,
    powerMostW,
    driven,
    nodes,
  )
  addRareSpace(lattice)
}

/** What few bodies have. */
function addRareSpace(lattice: Lattice): void {
  if (lattice.guidedCount > 0) addGuidedSpace(lattice)
  if (lattice.dragCount > 0) addDragSpace(lattice)
  if (lattice.fillCount > 0) addVolumes(lattice)
  if (lattice.apartCount > 0) addApartSpace(lattice)
}

export function runSpace(lattice: Lattice, steps: number): void {
  const { nodeCount, passiveCount, activeCount, guidedCount, groupCount, prescribedCount, nodes } = lattice
  const {
    ends,
    stiffnessNpm: k,
    stiffnessRestN: kL,
    dampingNspm: c,
    inverseMass,
    sensorCount,
    touching,
  } = lattice
  const {
    group,
    strainCos,
    strainSin,
    limitN,
    powerMostW,
    driven,
    rotors,
    rotation,
    rotationTurn,
    sweepSteps,
  } = lattice
  const { heightsM, terrain, contact, friction, rampSteps, driveStartStep } = lattice
  const { groundColumns, groundRows, heading } = lattice
  const world = Float64Array.of(lattice.stepSeconds, lattice.dragNspm, ...lattice.gravity)
  const senses = sensorCount > 0
  const hasRare = guidedCount + lattice.dragCount + lattice.fillCount + lattice.apartCount > 0
  for (let i = 0; i < steps; i++) {
    if (senses || guidedCount > 0) guide(lattice)
    addPassiveSpace(passiveCount, ends, k, kL, c, nodes)
    addActiveSpace(
      passiveCount,
      activeCount,
      ends,
      k,
      kL,
      c,
      group,
      strainCos,
      strainSin,
      limitN,
      powerMostW,
      driven,
      nodes,
    )
    if (hasRare) addRareSpace(lattice)
    integrateSpace(
      nodeCount,
      world,
      inverseMass,
      heightsM,
      groundColumns,
      groundRows,
      terrain,
      contact,
      friction,
      heading,
      senses,
      touching,
      nodes,
    )
    lattice.step++
    const since = lattice.step - driveStartStep
    if (since < 0 || groupCount === 0) continue
    turnDrive(since, groupCount, rampSteps, rotors, rotation, rotationTurn, sweepSteps, driven, lattice)
    if (prescribedCount > 0) movePrescribed(lattice)
  }
}
