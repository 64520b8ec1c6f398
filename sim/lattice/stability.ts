// How large a step may be. Symplectic Euler on one damped oscillator, frequency w, damping ratio z, is stable
// while  h w < 2 (sqrt(1 + z^2) - z)  (Hairer, Lubich and Wanner, Geometric Numerical Integration, 2006, for the
// undamped limit h w < 2, from memory; the damped one derived: the step's matrix has determinant 1 - 2 z h w,
// trace 2 - 2 z h w - (h w)^2, and its spectral radius reaches 1 at that value).
//
// For a lattice, w is bounded from above by  w_max^2 <= 2 max_i (sum_j k_ij) / m_i  (Gershgorin's circle theorem
// on the mass-scaled stiffness matrix; each strut contributes its axial stiffness to a row twice, once on and
// once off the diagonal), the contact spring counted at its stiffest. The damping rate g = 2 z w is bounded in
// the same way from dashpots, contact damping and drag; written as  h^2 w^2 + 2 h g < 4  the condition is
// monotone in both, so that two upper bounds give a safe step.

import type { ContactSpec, LatticeSpec, StrutSpec } from './spec.js'

/** Steps are chosen at most this fraction of the bound: contact and large turns are not linear. */
export const stepSafety = 0.8

export interface StepBound {
  /** Upper bound of the highest angular frequency, rad/s. */
  readonly highestRadps: number
  /** Upper bound of the damping ratio at that frequency. */
  readonly dampingRatio: number
  /** Steps below this are stable for the linear system. */
  readonly limitSeconds: number
}

/** The largest stable step of one oscillator: 2 (sqrt(1 + z^2) - z) / w; infinite for w = 0. */
export function stableStepSeconds(angularRadps: number, dampingRatio: number): number {
  if (angularRadps === 0) return Number.POSITIVE_INFINITY
  return (2 * (Math.sqrt(1 + dampingRatio * dampingRatio) - dampingRatio)) / angularRadps
}

/** The largest slope of the ground, rise over run. */
export function steepestSlope(spec: LatticeSpec): number {
  const ground = spec.ground
  if (!ground) return 0
  let steepest = 0
  for (let i = 1; i < ground.heightsM.length; i++) {
    const rise = Math.abs(ground.heightsM[i]! - ground.heightsM[i - 1]!)
    steepest = Math.max(steepest, rise / ground.spacingM)
  }
  return steepest
}

/** Contact stiffness and damping of one node at the depth limit, N/m and N s/m, on level ground. */
function contactAtLimit(contact: ContactSpec): { stiffnessNpm: number; dampingNspm: number } {
  const root = contact.exponent === 1.5 ? Math.sqrt(contact.depthLimitM) : 1
  return {
    stiffnessNpm: contact.stiffness * contact.exponent * root,
    dampingNspm: contact.damping * contact.depthLimitM * root,
  }
}

/** The bound for a whole lattice. Pure arithmetic over the description; costs one pass. */
export function stepBound(spec: LatticeSpec): StepBound {
  const stiffnessNpm = new Float64Array(spec.nodes.length)
  const dampingNspm = new Float64Array(spec.nodes.length)
  const take = ({ a, b, stiffnessNpm: k, dampingNspm: c }: StrutSpec) => {
    stiffnessNpm[a]! += 2 * k
    stiffnessNpm[b]! += 2 * k
    dampingNspm[a]! += 2 * c
    dampingNspm[b]! += 2 * c
  }
  for (const strut of spec.struts) take(strut)
  for (const strut of spec.actuators ?? []) take(strut)
  // A contact acts on its own node only: it enters a row once, where a strut counts twice.
  const contact =
    spec.ground && spec.contact ? contactAtLimit(spec.contact) : { stiffnessNpm: 0, dampingNspm: 0 }
  const slope = steepestSlope(spec)
  const onSlope = 1 + slope * slope
  let highestSquared = 0
  let highestRate = 0
  for (const [i, node] of spec.nodes.entries()) {
    if (node.pinned) continue
    const k = stiffnessNpm[i]! + contact.stiffnessNpm * onSlope
    const c = dampingNspm[i]! + contact.dampingNspm * onSlope + (spec.dragNspm ?? 0)
    highestSquared = Math.max(highestSquared, k / node.massKg)
    highestRate = Math.max(highestRate, c / node.massKg)
  }
  const highestRadps = Math.sqrt(highestSquared)
  if (highestRadps === 0) {
    return {
      highestRadps,
      dampingRatio: 0,
      limitSeconds: highestRate > 0 ? 2 / highestRate : Number.POSITIVE_INFINITY,
    }
  }
  const dampingRatio = highestRate / (2 * highestRadps)
  return { highestRadps, dampingRatio, limitSeconds: stableStepSeconds(highestRadps, dampingRatio) }
}

/** The longest step that divides `wholeSeconds` into a multiple of `parts` and is at most `mostSeconds` and safe. */
export function chooseStep(
  bound: StepBound,
  wholeSeconds: number,
  mostSeconds: number,
  parts: number,
): number {
  const longest = Math.min(mostSeconds, stepSafety * bound.limitSeconds)
  return wholeSeconds / (parts * Math.ceil(wholeSeconds / (parts * longest) - 1e-9))
}
