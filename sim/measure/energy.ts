// Energy budget of a lattice: what is stored, what drives put in, where it goes, and by how much the sum does not close.
//
//   stored = kinetic + elastic (passive struts, areas, volumes, pairs) + height + contact
//   stored now - stored at the start = work in - losses + closing error
//
// Driven struts (active and guided) are seen from outside: all they give to their nodes is work in, also what
// their own spring lends and takes back. Paths of prescribed nodes put in minus the lattice's force times the node's
// speed. Losses are those of dashpots, drag, drag struts, contact damping and friction.
//
// Powers are taken between steps and summed by the trapezoidal rule over the samples, so the closing error is that of
// the sampling and of symplectic Euler: it shrinks in proportion to the step when every step is sampled. Sources: the
// power of each force law (sim/lattice/reference), e.g. Goldstein, Classical mechanics, 1980 (from memory).

import { addForces } from '../lattice/advance.js'
import type { Lattice } from '../lattice/layout.js'
import {
  apartJ,
  commandedRestM,
  contactJ,
  depthM,
  fillJ,
  gravitationalJ,
  kineticJ,
  lengthM,
  lengthRateMps,
  powerW,
} from '../lattice/observe.js'
import { coefficientPlane, coefficientSpace } from '../lattice/reference/friction.js'

export interface StoredEnergy {
  readonly kineticJ: number
  /** Passive struts. */
  readonly elasticJ: number
  /** Areas, volumes and keep-apart pairs. */
  readonly fillJ: number
  /** Of height, relative to the origin. */
  readonly gravityJ: number
  readonly contactJ: number
}

/** Where power goes, in the order of the accounts. */
export const accounts = [
  'actuators',
  'paths',
  'dashpots',
  'drag',
  'dragStruts',
  'contact',
  'friction',
] as const
export type Account = (typeof accounts)[number]
const worksIn = 2

/** A budget under way. */
export interface EnergyBudget {
  readonly start: StoredEnergy
  /** Joules in every account so far: work in, then losses. */
  readonly sums: Float64Array
  /** Powers at the last sample, W. */
  readonly powers: Float64Array
  readonly startStep: number
  step: number
}

export interface BudgetReport {
  readonly seconds: number
  readonly start: StoredEnergy
  readonly now: StoredEnergy
  /** Joules since the start: `actuators` and `paths` are work in, the others losses. */
  readonly joules: { readonly [A in Account]: number }
  readonly workInJ: number
  readonly lossJ: number
  /** (Stored now - stored at the start) - work in + losses, J. */
  readonly closingErrorJ: number
  /** Closing error over the largest of work in, losses and change of what is stored. */
  readonly closingError: number
}

/** What is stored at this instant. */
export function storedEnergy(lattice: Lattice): StoredEnergy {
  let elasticJ = 0
  for (let i = 0; i < lattice.passiveCount; i++) {
    const stretch = lengthM(lattice, i) - commandedRestM(lattice, i)
    elasticJ += 0.5 * lattice.stiffnessNpm[i]! * stretch * stretch
  }
  return {
    kineticJ: kineticJ(lattice),
    elasticJ,
    fillJ: fillJ(lattice) + apartJ(lattice),
    gravityJ: gravitationalJ(lattice),
    contactJ: contactJ(lattice),
  }
}

/** Opens a budget at the present state. */
export function openBudget(lattice: Lattice): EnergyBudget {
  return {
    start: storedEnergy(lattice),
    sums: new Float64Array(accounts.length),
    powers: powersOf(lattice),
    startStep: lattice.step,
    step: lattice.step,
  }
}

/** Takes the powers at this instant into the budget; best after every step, or after a few. */
export function sampleBudget(lattice: Lattice, budget: EnergyBudget): void {
  const seconds = (lattice.step - budget.step) * lattice.stepSeconds
  const powers = powersOf(lattice)
  for (let i = 0; i < powers.length; i++) {
    budget.sums[i]! += 0.5 * (budget.powers[i]! + powers[i]!) * seconds
    budget.powers[i] = powers[i]!
  }
  budget.step = lattice.step
}

/** The budget as it stands at the last sample, which must be the present state. */
export function reportBudget(lattice: Lattice, budget: EnergyBudget): BudgetReport {
  const now = storedEnergy(lattice)
  const total = (stored: StoredEnergy) =>
    stored.kineticJ + stored.elasticJ + stored.fillJ + stored.gravityJ + stored.contactJ
  const sum = (from: number, to: number) => budget.sums.slice(from, to).reduce((a, b) => a + b, 0)
  const workInJ = sum(0, worksIn)
  const lossJ = sum(worksIn, accounts.length)
  const change = total(now) - total(budget.start)
  const closingErrorJ = change - workInJ + lossJ
  const scale = Math.max(Math.abs(workInJ), lossJ, Math.abs(change))
  const joules = Object.fromEntries(accounts.map((account, i) => [account, budget.sums[i]!]))
  return {
    seconds: (lattice.step - budget.startStep) * lattice.stepSeconds,
    start: budget.start,
    now,
    joules: joules as { readonly [A in Account]: number },
    workInJ,
    lossJ,
    closingErrorJ,
    closingError: scale > 0 ? closingErrorJ / scale : 0,
  }
}

/** Powers of all accounts at this instant, W. */
function powersOf(lattice: Lattice): Float64Array {
  const { passiveCount, activeCount, guidedCount, dampingNspm } = lattice
  let actuators = 0
  let dashpots = 0
  for (let i = 0; i < passiveCount; i++) {
    const rate = lengthRateMps(lattice, i)
    dashpots += dampingNspm[i]! * rate * rate
  }
  for (let i = passiveCount; i < passiveCount + activeCount + guidedCount; i++)
    actuators += powerW(lattice, i)
  const ground = groundLosses(lattice)
  return Float64Array.of(
    actuators,
    pathPower(lattice),
    dashpots,
    dragPower(lattice),
    rodPower(lattice),
    ground.contactW,
    ground.frictionW,
  )
}

/** Power that prescribed nodes take in from what moves them, W. Leaves the lattice as it was. */
function pathPower(lattice: Lattice): number {
  const { prescribedCount, prescribedEnds, dimensions, nodes, nodeCount, stride } = lattice
  if (prescribedCount === 0) return 0
  addForces(lattice)
  let power = 0
  for (let i = 0; i < prescribedCount; i++) {
    const o = prescribedEnds[i]!
    for (let axis = 0; axis < dimensions; axis++) {
      power -= nodes[o + 2 * dimensions + axis]! * nodes[o + dimensions + axis]!
    }
  }
  for (let i = 0; i < nodeCount; i++) nodes.fill(0, i * stride + 2 * dimensions, (i + 1) * stride)
  return power
}

function dragPower({ nodes, nodeCount, stride, dimensions, inverseMass, dragNspm }: Lattice): number {
  if (dragNspm === 0) return 0
  let squared = 0
  for (let i = 0; i < nodeCount; i++) {
    if (inverseMass[i] === 0) continue
    for (let axis = 0; axis < dimensions; axis++) {
      const v = nodes[i * stride + dimensions + axis]!
      squared += v * v
    }
  }
  return dragNspm * squared
}

/** Drag struts: integral of v'Cv along the rod for a linear profile of v, (L/3)(va'Cva + va'Cvb + vb'Cvb). */
function rodPower({ nodes, dragCount, dragEnds, dragNormal, dragDifference, dimensions }: Lattice): number {
  let power = 0
  for (let i = 0; i < dragCount; i++) {
    const [a, b] = [dragEnds[2 * i]!, dragEnds[2 * i + 1]!]
    let [q, aa, ab, bb, da, db] = [0, 0, 0, 0, 0, 0]
    for (let axis = 0; axis < dimensions; axis++) {
      const d = nodes[b + axis]! - nodes[a + axis]!
      const [u, v] = [nodes[a + dimensions + axis]!, nodes[b + dimensions + axis]!]
      q += d * d
      aa += u * u
      ab += u * v
      bb += v * v
      da += d * u
      db += d * v
    }
    const normal = dragNormal[i]! * (aa + ab + bb)
    const along = (dragDifference[i]! * (da * da + da * db + db * db)) / q
    power += (Math.sqrt(q) / 3) * (normal - along)
  }
  return power
}

/**
 * Contact damping (f - k d^n) dd/dt and friction mu N |v_t| of all nodes in the ground, W. A foot that sticks loses
 * nothing.
 */
function groundLosses(lattice: Lattice): { contactW: number; frictionW: number } {
  const { nodes, nodeCount, stride, dimensions, inverseMass, contact, terrain, friction, heading } = lattice
  let [contactW, frictionW] = [0, 0]
  for (let i = 0; i < nodeCount; i++) {
    const o = i * stride
    if (nodes[o + 1]! >= terrain[2]! || inverseMass[i] === 0) continue
    const depth = depthM(lattice, i)
    if (!(depth > 0)) continue
    const [sx, sz] = slopes(lattice, nodes[o]!, dimensions === 3 ? nodes[o + 2]! : 0)
    const v = o + dimensions
    const [vx, vy, vz] = [nodes[v]!, nodes[v + 1]!, dimensions === 3 ? nodes[v + 2]! : 0]
    const sinking = sx * vx + sz * vz - vy
    const power = contact[2]! !== 0 ? depth * Math.sqrt(depth) : depth
    const elastic = contact[0]! * power
    const f = Math.max(0, elastic + contact[1]! * power * sinking)
    contactW += (f - elastic) * sinking
    if (f === 0) continue
    const longer = 1 + sx * sx + sz * sz
    // v . n with n = (-sx, 1, -sz) / sqrt(longer) is -sinking / sqrt(longer).
    const across = -sinking / longer
    const [tx, ty, tz] = [vx + across * sx, vy - across, vz + across * sz]
    const speed = Math.sqrt(tx * tx + ty * ty + tz * tz)
    const mu =
      dimensions === 2
        ? coefficientPlane(i, tx, friction)
        : coefficientSpace(i, tx, tz, friction, heading, nodes)
    if (speed > 0) frictionW += mu * f * Math.sqrt(longer) * speed
  }
  return { contactW, frictionW }
}

/** Slopes ds/dx and ds/dz of the ground where a node is; as the integration has them. */
function slopes(lattice: Lattice, x: number, z: number): readonly [number, number] {
  const { heightsM, terrain, groundColumns, groundRows } = lattice
  const cellOf = (along: number, last: number) => (along > 0 ? (along < last ? Math.floor(along) : last) : 0)
  const alongX = (x - terrain[0]!) * terrain[1]!
  const column = cellOf(alongX, groundColumns - 2)
  if (groundRows === 1) return [(heightsM[column + 1]! - heightsM[column]!) * terrain[1]!, 0]
  const alongZ = (z - terrain[3]!) * terrain[4]!
  const row = cellOf(alongZ, groundRows - 2)
  const corner = row * groundColumns + column
  const near = heightsM[corner]!
  const far = heightsM[corner + groundColumns]!
  const nearRise = heightsM[corner + 1]! - near
  const farRise = heightsM[corner + groundColumns + 1]! - far
  const u = alongX - column
  const w = alongZ - row
  return [
    (nearRise + (farRise - nearRise) * w) * terrain[1]!,
    (far + farRise * u - near - nearRise * u) * terrain[4]!,
  ]
}
