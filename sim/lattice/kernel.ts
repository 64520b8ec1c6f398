// The moving part of the lattice: forces and one step of symplectic Euler. Free functions over flat arrays,
// without allocation, closures or objects, only + - * / and square root, which IEEE 754 rounds the same way on
// every processor. Everything was checked when the lattice was built (build.ts).
//
// Layout: one record of `stride` numbers a node, x y | vx vy | fx fy (positionM, velocityMps, forceN), so that a
// strut touches two cache lines. Strut ends are offsets of records, not node numbers. A 3-D kernel is the same
// with stride 9 and one more component in every sum.
//
// Order matters, because floating-point addition is not associative: struts are visited by index, passive ones
// first, then active ones, then nodes by index. Always.
//
// A strut of zero length is not patched: it yields a force that is no number, and the choke point in advance.ts
// ends the simulation as failed.

/** Numbers a node takes in the node record. */
export const stride = 6
/** Offsets inside a record. */
export const velocityAt = 2
export const forceAt = 4

/** Keeps 0 / 0 away from a foot at rest, m/s; far below any speed that matters. */
const tiny = 1e-200

/**
 * Spring and dashpot of the struts `first` to `last - 1`; C = |pb - pa| - rest,
 *   tension T = stiffness * C + damping * dC/dt,   force on a = +T n,  on b = -T n,  n from a to b.
 * With d = pb - pa, q = d.d:  T / |d| = k - k rest / |d| + c (d . dv) / q.
 */
export function addPassiveForces(
  count: number,
  ends: Int32Array,
  stiffnessNpm: Float64Array,
  stiffnessRestN: Float64Array,
  dampingNspm: Float64Array,
  nodes: Float64Array,
): void {
  for (let i = 0; i < count; i++) {
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    const dx = nodes[b]! - nodes[a]!
    const dy = nodes[b + 1]! - nodes[a + 1]!
    const dvx = nodes[b + 2]! - nodes[a + 2]!
    const dvy = nodes[b + 3]! - nodes[a + 3]!
    const q = dx * dx + dy * dy
    const perQ = 1 / q
    const perLength = Math.sqrt(q) * perQ
    const scale =
      stiffnessNpm[i]! - stiffnessRestN[i]! * perLength + dampingNspm[i]! * (dx * dvx + dy * dvy) * perQ
    const fx = scale * dx
    const fy = scale * dy
    nodes[a + 4]! += fx
    nodes[a + 5]! += fy
    nodes[b + 4]! -= fx
    nodes[b + 5]! -= fy
  }
}

/**
 * As addPassiveForces, for struts whose rest length is commanded: rest (1 + strain sin(wt + phi)), by angle
 * addition from sin wt and cos wt of its group, sin(wt + phi) = sin wt cos phi + cos wt sin phi. Tension is kept
 * within +-limit. `first` is the index of the first active strut in the flat list; the drive arrays start there.
 */
export function addActiveForces(
  first: number,
  count: number,
  ends: Int32Array,
  stiffnessNpm: Float64Array,
  stiffnessRestN: Float64Array,
  dampingNspm: Float64Array,
  group: Int32Array,
  strainCos: Float64Array,
  strainSin: Float64Array,
  limitN: Float64Array,
  rotors: Float64Array,
  nodes: Float64Array,
): void {
  for (let j = 0; j < count; j++) {
    const i = first + j
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    const g = group[j]!
    const drive = rotors[g]! * strainCos[j]! + rotors[g + 1]! * strainSin[j]!
    const dx = nodes[b]! - nodes[a]!
    const dy = nodes[b + 1]! - nodes[a + 1]!
    const dvx = nodes[b + 2]! - nodes[a + 2]!
    const dvy = nodes[b + 3]! - nodes[a + 3]!
    const q = dx * dx + dy * dy
    const perQ = 1 / q
    const perLength = Math.sqrt(q) * perQ
    const commandedN = stiffnessRestN[i]! * (1 + drive)
    const most = limitN[j]! * perLength
    const free = stiffnessNpm[i]! - commandedN * perLength + dampingNspm[i]! * (dx * dvx + dy * dvy) * perQ
    const scale = Math.min(most, Math.max(-most, free))
    const fx = scale * dx
    const fy = scale * dy
    nodes[a + 4]! += fx
    nodes[a + 5]! += fy
    nodes[b + 4]! -= fx
    nodes[b + 5]! -= fy
  }
}

/**
 * One step of symplectic Euler for every node: v += h (f/m + g), x += h v, with contact and friction.
 *
 * Contact. Height field y = s(x), slope s'. The depth d = s(x) - y (vertical) is the generalised coordinate of
 * the contact, dd/dt = s' vx - vy:
 *   f = max(0, k d^n + lambda d^n dd/dt),   force = f * (-s', 1).
 * The elastic part is the gradient of a potential that is continuous where slopes change, and the rest only
 * takes energy out: no body gains energy from a kink of the ground. Its size along the normal is f sqrt(1 + s'^2).
 *
 * Friction is implicit Coulomb friction in one step, after the velocity has been advanced without it: with v* the
 * speed along the ground and N the normal force,  v = v* max(0, 1 - h mu N / (m |v*|)).  The foot sticks exactly as
 * long as friction can hold it, at every step size; friction never turns the velocity round, and two states never
 * drift apart through it. (The smoother v* q / (q + h mu N / m), q = sqrt(v*^2 + eps^2), lets a held foot creep at about
 * 2 s^2 h F / (m (1 - s^2)), s = F / (mu N): centimetres a second for light nodes.) mu follows the direction of v*.
 *
 * terrain: firstX, 1/spacing, highest height; contact: k, lambda, 1 when n is 1.5.
 */
export function integrate(
  count: number,
  stepSeconds: number,
  inverseMass: Float64Array,
  gravity: Float64Array,
  dragNspm: number,
  heightsM: Float64Array,
  terrain: Float64Array,
  contact: Float64Array,
  friction: Float64Array,
  nodes: Float64Array,
): void {
  const firstX = terrain[0]!
  const perSpacing = terrain[1]!
  const top = terrain[2]!
  const lastCell = heightsM.length - 2
  const k = contact[0]!
  const lambda = contact[1]!
  const rooted = contact[2]! !== 0
  for (let i = 0; i < count; i++) {
    const perKg = inverseMass[i]!
    const o = i * 6
    const x = nodes[o]!
    const y = nodes[o + 1]!
    const vx0 = nodes[o + 2]!
    const vy0 = nodes[o + 3]!
    let fx = nodes[o + 4]! - dragNspm * vx0
    let fy = nodes[o + 5]! - dragNspm * vy0
    nodes[o + 4] = 0
    nodes[o + 5] = 0
    if (perKg === 0) continue
    let normalN = 0
    let slope = 0
    if (y < top) {
      const along = (x - firstX) * perSpacing
      const cell = along > 0 ? (along < lastCell ? Math.floor(along) : lastCell) : 0
      const left = heightsM[cell]!
      const rise = heightsM[cell + 1]! - left
      // Before the first and after the last height the ground goes on as it began or ended.
      const depth = left + rise * (along - cell) - y
      if (depth > 0) {
        slope = rise * perSpacing
        const power = rooted ? depth * Math.sqrt(depth) : depth
        const f = power * (k + lambda * (slope * vx0 - vy0))
        if (f > 0) {
          fx -= f * slope
          fy += f
          normalN = f
        }
      }
    }
    let vx = vx0 + stepSeconds * (fx * perKg + gravity[0]!)
    let vy = vy0 + stepSeconds * (fy * perKg + gravity[1]!)
    if (normalN > 0) {
      const perLength = 1 / (1 + slope * slope)
      // v* along the ground is (vx + slope vy) / sqrt(1 + slope^2).
      const sliding = vx + slope * vy
      const mu = sliding > 0 ? friction[2 * i]! : friction[2 * i + 1]!
      const speed = Math.sqrt(sliding * sliding * perLength) + tiny
      const drop = stepSeconds * mu * normalN * Math.sqrt(1 + slope * slope) * perKg
      const change = -Math.min(1, drop / speed) * sliding * perLength
      vx += change
      vy += change * slope
    }
    nodes[o + 2] = vx
    nodes[o + 3] = vy
    nodes[o] = x + stepSeconds * vx
    nodes[o + 1] = y + stepSeconds * vy
  }
}

/** Turns every rotor (sin wt, cos wt) of the drive groups on by one step; rotation: (sin wh, cos wh) each. */
export function turnRotors(count: number, rotation: Float64Array, rotors: Float64Array): void {
  for (let g = 0; g < 2 * count; g += 2) {
    const s = rotors[g]!
    const c = rotors[g + 1]!
    const ds = rotation[g]!
    const dc = rotation[g + 1]!
    rotors[g] = s * dc + c * ds
    rotors[g + 1] = c * dc - s * ds
  }
}
