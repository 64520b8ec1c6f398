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
//
// A row also takes, in norms of its blocks: a drag strut (L/6) C [2 1; 1 2], so L max(cn, ct) / 2; an area or volume
// kappa/A0 (g g' + (A - A0) A''), so kappa/A0 (|g_i| sum_j |g_j| + |A - A0| sum_j |A''_ij|) with g = grad A; a
// keep-apart pair as a strut. Lengths and gradients are those at the start.

import { distanceM, signedSize } from './build-checks.js'
import type { ContactSpec, GroundSpec, LatticeSpec } from './spec.js'

/** Steps are chosen at most this fraction of the bound: contact and large turns are not linear. */
export const stepSafety = 0.8

export interface StepBound {
  /** Upper bound of the highest angular frequency, rad/s. */
  readonly highestRadps: number
  /** Upper bound of the damping ratio at that frequency. */
  readonly dampingRatio: number
  /** Steps below this are stable for the linear system. */
  readonly limitSeconds: number
  /** The node with the highest frequency. */
  readonly node: number
}

/** The largest stable step of one oscillator: 2 (sqrt(1 + z^2) - z) / w; infinite for w = 0. */
export function stableStepSeconds(angularRadps: number, dampingRatio: number): number {
  if (angularRadps === 0) return Number.POSITIVE_INFINITY
  return (2 * (Math.sqrt(1 + dampingRatio * dampingRatio) - dampingRatio)) / angularRadps
}

/** The largest slope of the ground, rise over run; in 3-D a bound from the largest slopes along x and along z. */
export function steepestSlope(ground: GroundSpec | undefined): number {
  if (!ground) return 0
  const { heightsM, spacingM, rows = 1, spacingZM = spacingM } = ground
  const columns = heightsM.length / rows
  let riseX = 0
  let riseZ = 0
  for (let i = 0; i < heightsM.length; i++) {
    const height = heightsM[i]!
    if (i % columns > 0) riseX = Math.max(riseX, Math.abs(height - heightsM[i - 1]!))
    if (i >= columns) riseZ = Math.max(riseZ, Math.abs(height - heightsM[i - columns]!))
  }
  if (riseZ === 0) return riseX / spacingM
  const x = riseX / spacingM
  const z = riseZ / spacingZM
  return Math.sqrt(x * x + z * z)
}

/** Contact stiffness and damping of one node at the depth limit, N/m and N s/m, on level ground. */
export function contactAtLimit(contact: ContactSpec): { stiffnessNpm: number; dampingNspm: number } {
  const root = contact.exponent === 1.5 ? Math.sqrt(contact.depthLimitM) : 1
  return {
    stiffnessNpm: contact.stiffness * contact.exponent * root,
    dampingNspm: contact.damping * contact.depthLimitM * root,
  }
}

/** Sums of every node's row, N/m and N s/m: all but contact and node drag. */
export interface StepRows {
  readonly rowStiffnessNpm: Float64Array
  readonly rowDampingNspm: Float64Array
}

export function stepRows(spec: LatticeSpec): StepRows {
  const rowStiffnessNpm = new Float64Array(spec.nodes.length)
  const rowDampingNspm = new Float64Array(spec.nodes.length)
  const take = (a: number, b: number, k: number, c: number) => {
    rowStiffnessNpm[a]! += 2 * k
    rowStiffnessNpm[b]! += 2 * k
    rowDampingNspm[a]! += 2 * c
    rowDampingNspm[b]! += 2 * c
  }
  const { struts, actuators = [], guided = [], keepApart = [], dragStruts = [] } = spec
  for (const list of [struts, actuators, guided]) {
    for (const { a, b, stiffnessNpm, dampingNspm } of list) take(a, b, stiffnessNpm, dampingNspm)
  }
  for (const { a, b, stiffnessNpm } of keepApart) take(a, b, stiffnessNpm, 0)
  for (const { a, b, normalNspm2, tangentNspm2 } of dragStruts) {
    take(a, b, 0, (distanceM(spec, a, b) * Math.max(normalNspm2, tangentNspm2)) / 4)
  }
  for (const { nodes, stiffnessNpm, restM2 } of spec.areas ?? []) {
    takeFill(spec, rowStiffnessNpm, nodes, stiffnessNpm, restM2)
  }
  for (const { nodes, stiffnessPa, restM3 } of spec.volumes ?? []) {
    takeFill(spec, rowStiffnessNpm, nodes, stiffnessPa, restM3)
  }
  return { rowStiffnessNpm, rowDampingNspm }
}

function takeFill(
  spec: LatticeSpec,
  rows: Float64Array,
  nodes: readonly number[],
  stiffness: number,
  restGiven: number | undefined,
): void {
  const size = signedSize(spec, nodes)
  const rest = restGiven ?? size
  const gradients = nodes.map((_, i) => gradientNorm(spec, nodes, i))
  const sum = gradients.reduce((a, b) => a + b, 0)
  for (const [i, node] of nodes.entries()) {
    // |A''_ij| is 1/2 in a triangle; in a tetrahedron a sixth of the edge opposite to ij.
    let second = 1
    if (nodes.length === 4) {
      const others = nodes.filter((_, j) => j !== i)
      second = others.reduce((s, a, n) => s + distanceM(spec, a, others[(n + 1) % 3]!), 0) / 6
    }
    rows[node]! += (stiffness / rest) * (gradients[i]! * sum + Math.abs(size - rest) * second)
  }
}

/** |dA/dp_i| (half the opposite side) or |dV/dp_i| (a third of the opposite face). */
function gradientNorm(spec: LatticeSpec, nodes: readonly number[], i: number): number {
  const [a, b, c] = nodes.filter((_, j) => j !== i) as [number, number, number?]
  if (c === undefined) return distanceM(spec, a, b) / 2
  const at = (node: number) => spec.nodes[node]!.positionM
  const edge = (to: number) => at(to).map((value, axis) => value - at(a)[axis]!) as [number, number, number]
  const [p, q] = [edge(b), edge(c)]
  const x = p[1] * q[2] - p[2] * q[1]
  const y = p[2] * q[0] - p[0] * q[2]
  const z = p[0] * q[1] - p[1] * q[0]
  return Math.sqrt(x * x + y * y + z * z) / 6
}

/** The bound for a whole lattice. Pure arithmetic over the description; costs one pass. */
export function stepBound(spec: LatticeSpec): StepBound {
  return boundOf(spec, stepRows(spec))
}

/** As stepBound(), from sums that are known already; another ground, drag and slope may be given (vary.ts). */
export function boundOf(
  spec: LatticeSpec,
  { rowStiffnessNpm, rowDampingNspm }: StepRows,
  ground = spec.ground,
  dragNspm = spec.dragNspm ?? 0,
  slope = steepestSlope(ground),
): StepBound {
  // A contact acts on its own node only: it enters a row once, where a strut counts twice.
  const contact = ground && spec.contact ? contactAtLimit(spec.contact) : { stiffnessNpm: 0, dampingNspm: 0 }
  const onSlope = 1 + slope * slope
  let highestSquared = 0
  let highestRate = 0
  let fastest = 0
  const moved = new Set((spec.prescribed ?? []).map((path) => path.node))
  for (let i = 0; i < spec.nodes.length; i++) {
    const { massKg, pinned } = spec.nodes[i]!
    if (pinned || moved.has(i)) continue
    const k = rowStiffnessNpm[i]! + contact.stiffnessNpm * onSlope
    const c = rowDampingNspm[i]! + contact.dampingNspm * onSlope + dragNspm
    if (k / massKg > highestSquared) fastest = i
    highestSquared = Math.max(highestSquared, k / massKg)
    highestRate = Math.max(highestRate, c / massKg)
  }
  return { ...boundOfRates(highestSquared, highestRate), node: fastest }
}

/** The bound from the highest row of stiffness over mass, 1/s^2, and of damping over mass, 1/s. */
export function boundOfRates(highestSquared: number, highestRate: number): Omit<StepBound, 'node'> {
  const highestRadps = Math.sqrt(highestSquared)
  if (highestRadps === 0) {
    const limitSeconds = highestRate > 0 ? 2 / highestRate : Number.POSITIVE_INFINITY
    return { highestRadps, dampingRatio: 0, limitSeconds }
  }
  const dampingRatio = highestRate / (2 * highestRadps)
  return { highestRadps, dampingRatio, limitSeconds: stableStepSeconds(highestRadps, dampingRatio) }
}

/** The longest step that divides `wholeSeconds` into a multiple of `parts` and is at most `mostSeconds` and safe. */
export function chooseStep(
  bound: Pick<StepBound, 'limitSeconds'>,
  wholeSeconds: number,
  mostSeconds: number,
  parts: number,
): number {
  const longest = Math.min(mostSeconds, stepSafety * bound.limitSeconds)
  return wholeSeconds / (parts * Math.ceil(wholeSeconds / (parts * longest) - 1e-9))
}
