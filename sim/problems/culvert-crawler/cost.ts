// What a trial of a crawler costs, straight from its genome. The coordinator asks for it at every birth, and building the
// body (body.ts, trial.ts) only to count its steps was a third of a birth and most of its garbage.
//
// Sums are taken in the order in which the body and its lattice take them, so that the cost is the same number as
// costOf(buildBody(genome)): a test compares them.

import { boundOfRates, chooseStep, contactAtLimit } from '../../lattice/stability.js'
import {
  actuator,
  baysMost,
  type CrawlerGenome,
  columnsMost,
  feet,
  kinds,
  none,
  placesPerColumn,
} from './genome.js'
import { unitsOf } from './measure.js'
import { numbers } from './numbers.js'
import { contactSpec, frameSeconds, stepsPerTrial } from './trial.js'

const youngPa = kinds.map((kind) =>
  kind === 'firm' || kind === 'hard' ? numbers.youngPa[kind] : numbers.youngPa.soft,
)
const bareFoot = feet.indexOf('bare')
const contact = contactAtLimit(contactSpec)

/** Where the struts of column i begin and end, as nodes from node 2 i on; in the order of `places`. */
const from = [0, 0, 1, 0, 1]
const to = [1, 2, 3, 3, 2]

// Written anew for every genome: nothing of one is seen by the next.
const nodesMost = 2 * columnsMost
const placesM = new Float64Array(columnsMost)
const massesKg = new Float64Array(nodesMost)
const rowNpm = new Float64Array(nodesMost)
const rowNspm = new Float64Array(nodesMost)
const lengthsM = new Float64Array(columnsMost * placesPerColumn)

/** Expected cost of a (repaired) genome on a floor of this slope at most; the same as costOf() of its body. */
export function crawlerCost(genome: CrawlerGenome, slopeMost: number): number {
  const { struts, nodes, bound } = sumUp(genome, slopeMost)
  const step = chooseStep(bound, frameSeconds, numbers.stepSecondsMost, numbers.samplesPerFrame)
  return unitsOf(struts, nodes, stepsPerTrial(step))
}

/** How many struts and nodes the body has, and the bound of its step: bit for bit that of describeMachine(). */
export function sumUp(genome: CrawlerGenome, slopeMost: number) {
  const columns = genome.bays[0]! + 1
  const nodes = 2 * columns
  placeColumns(genome, columns)
  const struts = weighStruts(genome, columns)
  // A lattice takes passive struts first.
  rowNpm.fill(0, 0, nodes)
  rowNspm.fill(0, 0, nodes)
  stiffen(genome, columns, false)
  stiffen(genome, columns, true)
  return { struts, nodes, bound: boundOn(nodes, slopeMost) }
}

function placeColumns({ bayLength }: CrawlerGenome, columns: number): void {
  let lengthM = 0
  for (let i = 0; i < columns - 1; i++) lengthM += bayLength[i]!
  let x = -lengthM
  for (let i = 0; i < columns; i++) {
    placesM[i] = x
    x += i < baysMost ? bayLength[i]! : 0
  }
}

/** Lengths of the struts and masses of the nodes; how many struts there are. */
function weighStruts({ struts, height, foot }: CrawlerGenome, columns: number): number {
  massesKg.fill(numbers.jointKg, 0, 2 * columns)
  const last = (columns - 1) * placesPerColumn
  let count = 0
  for (let slot = 0; slot <= last; slot++) {
    const kind = struts[slot]!
    if (kind === none) continue
    count++
    const place = slot % placesPerColumn
    const column = (slot - place) / placesPerColumn
    const a = 2 * column + from[place]!
    const b = 2 * column + to[place]!
    const dx = placesM[b >> 1]! - placesM[a >> 1]!
    const dy = (b % 2 === 1 ? height[b >> 1]! : 0) - (a % 2 === 1 ? height[a >> 1]! : 0)
    const lengthM = Math.sqrt(dx * dx + dy * dy)
    lengthsM[slot] = lengthM
    const rubberKg = numbers.rubberKgpm3 * numbers.strutAreaM2 * lengthM
    const massKg = rubberKg + (kind === actuator ? numbers.actuatorFittingKg : 0)
    massesKg[a]! += massKg / 2
    massesKg[b]! += massKg / 2
  }
  for (let i = 0; i < columns; i++) if (foot[i]! !== bareFoot) massesKg[2 * i]! += numbers.padKg
  massesKg[2 * Math.floor(columns / 2) + 1]! += numbers.puckKg
  return count
}

/** Adds the struts that are actuators, or those that are not, to the rows of their nodes. */
function stiffen({ struts }: CrawlerGenome, columns: number, active: boolean): void {
  const last = (columns - 1) * placesPerColumn
  for (let slot = 0; slot <= last; slot++) {
    const kind = struts[slot]!
    if (kind === none || (kind === actuator) !== active) continue
    const place = slot % placesPerColumn
    const first = 2 * ((slot - place) / placesPerColumn)
    const a = first + from[place]!
    const b = first + to[place]!
    const stiffnessNpm = (youngPa[kind]! * numbers.strutAreaM2) / lengthsM[slot]!
    const dampingNspm = stiffnessNpm * numbers.relaxationSeconds
    rowNpm[a]! += 2 * stiffnessNpm
    rowNpm[b]! += 2 * stiffnessNpm
    rowNspm[a]! += 2 * dampingNspm
    rowNspm[b]! += 2 * dampingNspm
  }
}

function boundOn(nodes: number, slopeMost: number) {
  const onSlope = 1 + slopeMost * slopeMost
  const groundNpm = contact.stiffnessNpm * onSlope
  const groundNspm = contact.dampingNspm * onSlope
  let highestSquared = 0
  let highestRate = 0
  for (let i = 0; i < nodes; i++) {
    highestSquared = Math.max(highestSquared, (rowNpm[i]! + groundNpm) / massesKg[i]!)
    const dampingNspm = rowNspm[i]! + groundNspm + numbers.settleDragNspm
    highestRate = Math.max(highestRate, dampingNspm / massesKg[i]!)
  }
  return boundOfRates(highestSquared, highestRate)
}
