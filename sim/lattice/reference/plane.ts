// Steps of a lattice in the plane: the order of everything (layout.ts). Arrays are read off the lattice once a call.

import type { Lattice } from '../layout.js'
import { movePrescribed, turnDrive } from './drive.js'
import { addAreas } from './fills.js'
import { guide } from './guide.js'
import { integratePlane } from './plane-nodes.js'
import {
  addActivePlane,
  addApartPlane,
  addDragPlane,
  addGuidedPlane,
  addPassivePlane,
} from './plane-struts.js'

/** Forces of everything but node drag, contact and friction, added to the force fields. */
export function addForcesPlane(lattice: Lattice): void {
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
  addPassivePlane(passiveCount, ends, k, kL, c, nodes)
  addActivePlane(
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
  addRarePlane(lattice)
}

/** What few bodies have. */
function addRarePlane(lattice: Lattice): void {
  if (lattice.guidedCount > 0) addGuidedPlane(lattice)
  if (lattice.dragCount > 0) addDragPlane(lattice)
  if (lattice.fillCount > 0) addAreas(lattice)
  if (lattice.apartCount > 0) addApartPlane(lattice)
}

export function runPlane(lattice: Lattice, steps: number): void {
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
  const world = Float64Array.of(lattice.stepSeconds, lattice.dragNspm, ...lattice.gravity)
  const senses = sensorCount > 0
  const hasRare = guidedCount + lattice.dragCount + lattice.fillCount + lattice.apartCount > 0
  for (let i = 0; i < steps; i++) {
    if (senses || guidedCount > 0) guide(lattice)
    addPassivePlane(passiveCount, ends, k, kL, c, nodes)
    addActivePlane(
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
    if (hasRare) addRarePlane(lattice)
    integratePlane(
      nodeCount,
      world,
      inverseMass,
      heightsM,
      terrain,
      contact,
      friction,
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
