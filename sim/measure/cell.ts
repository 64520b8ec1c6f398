// A unit cell that repeats for ever: nodes, what joins them, and the lattice vectors. Its parts are struts (central
// springs), hinges (angle springs), beams (Euler-Bernoulli, welded ends) and areas (springs on the area of a
// triangle). Small displacements about the positions given, which carry no stress.
//
// Every part is written as springs on one linear form of the displacements, energy 1/2 k e^2 with
// e = sum of (gradient . u) over its corners, so that the solvers need to know one kind only (SpringForm).
// SI units; a 2-D cell is a sheet of unit thickness (N/m instead of Pa), a 1-D one a chain.

import { refuse } from '../../shared/refusals.js'

export interface CellNode {
  readonly positionM: readonly number[]
  /** Needed for waves only. */
  readonly massKg?: number
}

/** A node of this cell or of the cell `shift` lattice vectors away (none when absent). */
export interface CellCorner {
  readonly node: number
  readonly shift?: readonly number[]
}

/** A spring from node a of this cell to node b of the cell `shift` away. */
export interface CellStrut {
  readonly a: number
  readonly b: number
  readonly shift?: readonly number[]
  readonly stiffnessNpm: number
}

/** A spring on the angle between the arms from `at` to `left` and to `right`; 2-D. */
export interface CellHinge {
  readonly at: number
  readonly left: CellCorner
  readonly right: CellCorner
  readonly stiffnessNmprad: number
}

/** A straight beam welded to its nodes (which turn with it); 2-D. EA in N, EI in N m^2. */
export interface CellBeam {
  readonly a: number
  readonly b: number
  readonly shift?: readonly number[]
  readonly stretchN: number
  readonly bendingNm2: number
}

/** A spring on the area of a triangle, energy 1/2 stiffness (A - A0)^2 / A0; 2-D, stiffness in N/m. */
export interface CellArea {
  readonly corners: readonly [CellCorner, CellCorner, CellCorner]
  readonly stiffnessNpm: number
}

export interface CellSpec {
  /** As many vectors, of as many numbers, as the cell has dimensions (1 to 3). */
  readonly vectorsM: readonly (readonly number[])[]
  readonly nodes: readonly CellNode[]
  readonly struts?: readonly CellStrut[]
  readonly hinges?: readonly CellHinge[]
  readonly beams?: readonly CellBeam[]
  readonly areas?: readonly CellArea[]
}

/** One corner's share of a form. */
export interface FormTerm {
  /** First of the coordinates that the coefficients belong to. */
  readonly at: number
  readonly coefficients: readonly number[]
  /** Where the corner is, shift included; absent for a rotation, which an affine strain does not change. */
  readonly placeM?: readonly number[]
  /** Of the corner's cell, in metres. */
  readonly offsetM: readonly number[]
}

/** Energy 1/2 stiffness e^2, e = sum of coefficients times coordinates. */
export interface SpringForm {
  readonly stiffness: number
  readonly terms: readonly FormTerm[]
}

/** A cell ready to be solved: `size` coordinates, displacements first (node by node), then rotations of beam ends. */
export interface CellForms {
  readonly dimensions: number
  readonly size: number
  readonly forms: readonly SpringForm[]
}

interface Corner {
  readonly node: number
  readonly placeM: readonly number[]
  readonly offsetM: readonly number[]
}

/** Checks a cell (Refusal 'impossible-value' naming the field) and writes it as springs. */
export function cellForms(cell: CellSpec): CellForms {
  checkCell(cell)
  const dimensions = cell.vectorsM.length
  const ends = new Set((cell.beams ?? []).flatMap(({ a, b }) => [a, b]))
  const turning = [...ends].sort((a, b) => a - b)
  const rotationAt = new Map(turning.map((node, i) => [node, cell.nodes.length * dimensions + i]))
  const corner = (one: CellCorner) => cornerOf(cell, one)
  return {
    dimensions,
    size: cell.nodes.length * dimensions + turning.length,
    forms: [
      ...(cell.struts ?? []).map(({ a, b, shift, stiffnessNpm }) =>
        stretchForm(corner({ node: a }), corner(shifted(b, shift)), stiffnessNpm),
      ),
      ...(cell.hinges ?? []).map((hinge) =>
        angleForm(corner({ node: hinge.at }), corner(hinge.left), corner(hinge.right), hinge.stiffnessNmprad),
      ),
      ...(cell.beams ?? []).flatMap((beam) =>
        beamForms(corner({ node: beam.a }), corner(shifted(beam.b, beam.shift)), beam, rotationAt),
      ),
      ...(cell.areas ?? []).map(({ corners, stiffnessNpm }) => areaForm(corners.map(corner), stiffnessNpm)),
    ],
  }
}

function shifted(node: number, shift: readonly number[] | undefined): CellCorner {
  return shift ? { node, shift } : { node }
}

function cornerOf({ vectorsM, nodes }: CellSpec, { node, shift }: CellCorner): Corner {
  const offsetM = vectorsM.map((_, axis) =>
    vectorsM.reduce((sum, vector, i) => sum + (shift?.[i] ?? 0) * vector[axis]!, 0),
  )
  return { node, placeM: nodes[node]!.positionM.map((x, axis) => x + offsetM[axis]!), offsetM }
}

function displacement({ node, placeM, offsetM }: Corner, coefficients: readonly number[]): FormTerm {
  return { at: node * placeM.length, coefficients, placeM, offsetM }
}

const lengthOf = (v: readonly number[]) => Math.sqrt(v.reduce((sum, x) => sum + x * x, 0))
const between = (a: Corner, b: Corner) => b.placeM.map((x, axis) => x - a.placeM[axis]!)

/** Change of the distance of two corners. */
function stretchForm(a: Corner, b: Corner, stiffness: number): SpringForm {
  const d = between(a, b)
  const length = lengthOf(d)
  const along = d.map((x) => x / length)
  const against = along.map((x) => -x)
  return { stiffness, terms: [displacement(a, against), displacement(b, along)] }
}

/** How fast the direction from a to b turns with the displacement of b, rad/m: d turned left, over |d|^2. */
function turningOf(a: Corner, b: Corner): [number, number] {
  const [dx, dy] = between(a, b) as [number, number]
  const squared = dx * dx + dy * dy
  return [-dy / squared, dx / squared]
}

/** Change of the angle at `at` from `left` to `right`. */
function angleForm(at: Corner, left: Corner, right: Corner, stiffness: number): SpringForm {
  const l = turningOf(at, left)
  const r = turningOf(at, right)
  return {
    stiffness,
    terms: [
      displacement(at, [l[0] - r[0], l[1] - r[1]]),
      displacement(left, [-l[0], -l[1]]),
      displacement(right, r),
    ],
  }
}

/**
 * Stretching (EA/L), bending in one arc (EI/L on the difference of the end rotations) and in an S (3 EI/L on their sum
 * less twice the rotation of the chord): the Euler-Bernoulli element (e.g. Przemieniecki, Theory of matrix
 * structural analysis, 1968, from memory), its energy written as a sum of squares.
 */
function beamForms(
  a: Corner,
  b: Corner,
  { stretchN, bendingNm2 }: CellBeam,
  rotationAt: ReadonlyMap<number, number>,
): SpringForm[] {
  const length = lengthOf(between(a, b))
  const [tx, ty] = turningOf(a, b)
  const rotation = (one: Corner, coefficient: number): FormTerm => {
    return { at: rotationAt.get(one.node)!, coefficients: [coefficient], offsetM: one.offsetM }
  }
  return [
    stretchForm(a, b, stretchN / length),
    { stiffness: bendingNm2 / length, terms: [rotation(a, -1), rotation(b, 1)] },
    {
      stiffness: (3 * bendingNm2) / length,
      terms: [
        rotation(a, 1),
        rotation(b, 1),
        displacement(a, [2 * tx, 2 * ty]),
        displacement(b, [-2 * tx, -2 * ty]),
      ],
    },
  ]
}

/** Twice the signed area of three corners, m^2. */
function twiceArea([p, q, r]: readonly Corner[]): number {
  const [ax, ay] = between(p!, q!) as [number, number]
  const [bx, by] = between(p!, r!) as [number, number]
  return ax * by - ay * bx
}

/** Change of the area, whose gradient at a corner is half the opposite edge, turned. */
function areaForm(corners: readonly Corner[], stiffnessNpm: number): SpringForm {
  const area = Math.abs(twiceArea(corners)) / 2
  const terms = corners.map((corner, i) => {
    const [ex, ey] = between(corners[(i + 1) % 3]!, corners[(i + 2) % 3]!) as [number, number]
    return displacement(corner, [-ey / 2, ex / 2])
  })
  return { stiffness: stiffnessNpm / area, terms }
}

// --------------------------------------------------------------------------------------------- checks

function demand(truth: boolean, field: string, found: unknown, expected: string): asserts truth {
  if (!truth) {
    throw refuse('impossible-value', {
      detail: `found ${String(found)}, expected ${expected}.`,
      where: { field: `cell.${field}` },
    })
  }
}

/** Length, area or volume of the cell, by the vectors' determinant. */
export function cellMeasure(vectorsM: readonly (readonly number[])[]): number {
  const [a, b, c] = vectorsM
  if (!b) return Math.abs(a![0]!)
  if (!c) return Math.abs(a![0]! * b[1]! - a![1]! * b[0]!)
  const [x, y, z] = [
    b[1]! * c[2]! - b[2]! * c[1]!,
    b[2]! * c[0]! - b[0]! * c[2]!,
    b[0]! * c[1]! - b[1]! * c[0]!,
  ]
  return Math.abs(a![0]! * x + a![1]! * y + a![2]! * z)
}

function checkCell(cell: CellSpec): void {
  const dimensions = cell.vectorsM.length
  demand(dimensions >= 1 && dimensions <= 3, 'vectorsM', dimensions, '1 to 3 lattice vectors')
  for (const [i, vector] of cell.vectorsM.entries()) {
    const sound = vector.length === dimensions && vector.every(Number.isFinite)
    demand(sound, `vectorsM[${i}]`, `[${vector}]`, `${dimensions} finite numbers`)
  }
  const spans = cell.vectorsM.reduce((product, vector) => product * lengthOf(vector), 1)
  const measure = cellMeasure(cell.vectorsM)
  demand(measure > 1e-9 * spans, 'vectorsM', `a cell of size ${measure}`, 'independent lattice vectors')
  demand(cell.nodes.length > 0, 'nodes', 'none', 'at least one node')
  for (const [i, { positionM, massKg }] of cell.nodes.entries()) {
    const sound = positionM.length === dimensions && positionM.every(Number.isFinite)
    demand(sound, `nodes[${i}].positionM`, `[${positionM}]`, `${dimensions} finite numbers`)
    const heavy = massKg === undefined || (Number.isFinite(massKg) && massKg > 0)
    demand(heavy, `nodes[${i}].massKg`, massKg, 'a finite mass above 0')
  }
  checkParts(cell, dimensions)
}

function checkParts(cell: CellSpec, dimensions: number): void {
  const flat = (field: string, count: number) =>
    demand(count === 0 || dimensions === 2, field, `them in ${dimensions} dimensions`, 'a cell of 2')
  const stiff = (field: string, k: number) =>
    demand(Number.isFinite(k) && k >= 0, field, k, 'a finite number of at least 0')
  const { struts = [], hinges = [], beams = [], areas = [] } = cell
  for (const [i, strut] of struts.entries()) {
    checkSpan(cell, `struts[${i}]`, { node: strut.a }, shifted(strut.b, strut.shift))
    stiff(`struts[${i}].stiffnessNpm`, strut.stiffnessNpm)
  }
  flat('hinges', hinges.length)
  for (const [i, hinge] of hinges.entries()) {
    checkSpan(cell, `hinges[${i}].left`, { node: hinge.at }, hinge.left)
    checkSpan(cell, `hinges[${i}].right`, { node: hinge.at }, hinge.right)
    stiff(`hinges[${i}].stiffnessNmprad`, hinge.stiffnessNmprad)
  }
  flat('beams', beams.length)
  for (const [i, beam] of beams.entries()) {
    checkSpan(cell, `beams[${i}]`, { node: beam.a }, shifted(beam.b, beam.shift))
    stiff(`beams[${i}].stretchN`, beam.stretchN)
    stiff(`beams[${i}].bendingNm2`, beam.bendingNm2)
  }
  flat('areas', areas.length)
  for (const [i, { corners, stiffnessNpm }] of areas.entries()) {
    for (const one of corners) checkCorner(cell, `areas[${i}].corners`, one)
    const area = Math.abs(twiceArea(corners.map((one) => cornerOf(cell, one))))
    demand(area > 0, `areas[${i}].corners`, 'three corners on one line', 'a triangle')
    stiff(`areas[${i}].stiffnessNpm`, stiffnessNpm)
  }
}

function checkCorner({ nodes, vectorsM }: CellSpec, field: string, { node, shift }: CellCorner): void {
  const isNode = Number.isInteger(node) && node >= 0 && node < nodes.length
  demand(isNode, field, `node ${node}`, `a node, 0 to ${nodes.length - 1}`)
  const whole = !shift || (shift.length === vectorsM.length && shift.every(Number.isInteger))
  demand(whole, field, `shift [${shift}]`, `${vectorsM.length} whole numbers`)
}

/** Two corners of the cell, at different places. */
function checkSpan(cell: CellSpec, field: string, from: CellCorner, to: CellCorner): void {
  checkCorner(cell, field, from)
  checkCorner(cell, field, to)
  const apart = lengthOf(between(cornerOf(cell, from), cornerOf(cell, to)))
  demand(apart > 0, field, 'both ends at one place', 'a length above 0')
}
