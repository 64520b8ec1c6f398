// The two bodies that the kernel is measured on: a plate of 12 x 8 nodes with 326 struts and a block of 8 x 6 x 5 nodes
// with 1,608, cells of 20 mm braced along every diagonal of their faces, three struts in ten active, on ground that is
// nearly flat. Replicates differ in friction, in the phases of their actuators and in how they start.

import { stream } from '../../../shared/streams.js'
import { buildLattice } from '../../../sim/lattice/build.js'
import type { Lattice } from '../../../sim/lattice/layout.js'
import type { LatticeSpec, StrutSpec } from '../../../sim/lattice/spec.js'
import { varyLattice } from '../../../sim/lattice/vary.js'

const cellM = 0.02
const counts = { 2: [12, 8, 1], 3: [8, 6, 5] } as const
/** From a node to its neighbours, along edges and both diagonals of every face. */
const steps = [
  [1, 0, 0],
  [0, 1, 0],
  [0, 0, 1],
  [1, 1, 0],
  [1, -1, 0],
  [1, 0, 1],
  [1, 0, -1],
  [0, 1, 1],
  [0, 1, -1],
] as const

export function benchSpec(dimensions: 2 | 3): LatticeSpec {
  const draw = stream(20_261_201, 'spare', 1, dimensions)
  const between = (low: number, high: number) => low + draw.uniform() * (high - low)
  const [columns, rows, layers] = counts[dimensions]
  const struts: StrutSpec[] = []
  const places: number[][] = []
  const number = (i: number, j: number, k: number) => (i * rows + j) * layers + k
  const inside = (i: number, j: number, k: number) =>
    i < columns && j >= 0 && j < rows && k >= 0 && k < layers
  for (let i = 0; i < columns; i++)
    for (let j = 0; j < rows; j++)
      for (let k = 0; k < layers; k++) {
        places.push([i * cellM, j * cellM, k * cellM].slice(0, dimensions))
        for (const [di, dj, dk] of steps) {
          if (!inside(i + di, j + dj, k + dk)) continue
          const stiffnessNpm = between(400, 800)
          struts.push({
            a: number(i, j, k),
            b: number(i + di, j + dj, k + dk),
            stiffnessNpm,
            dampingNspm: between(0.15, 0.25),
          })
        }
      }
  const isActive = (i: number) => i % 10 === 1 || i % 10 === 4 || i % 10 === 8
  return {
    dimensions,
    nodes: places.map((positionM) => ({ positionM, massKg: between(0.004, 0.006) })),
    struts: struts.filter((_, i) => !isActive(i)),
    actuators: struts
      .filter((_, i) => isActive(i))
      .map((strut) => {
        // A wave that travels along the body.
        const phaseTurns = -places[strut.a]![0]! / (columns * cellM)
        return { ...strut, group: 0, strain: 0.08, phaseTurns, forceLimitN: 5 }
      }),
    groups: [{ frequencyHz: 1.5 }],
    gravityMps2: dimensions === 2 ? [0, -9.81] : [0, -9.81, 0],
    dragNspm: 0.001,
    ground: ground(dimensions),
    contact: { stiffness: 1500, damping: 1500, exponent: 1, depthLimitM: 0.01 },
    stepSeconds: 2e-4,
  }
}

function ground(dimensions: 2 | 3) {
  const draw = stream(20_261_201, 'spare', 2, dimensions)
  const rows = dimensions === 3 ? 40 : 1
  const heightsM = Array.from({ length: 200 * rows }, () => 5e-4 * draw.uniform())
  return { firstXM: -1, spacingM: 0.01, heightsM, rows, firstZM: -0.16, spacingZM: 0.01 }
}

/** Situations of one body side by side. */
export function benchReplicates(dimensions: 2 | 3, count: number): Lattice[] {
  const spec = benchSpec(dimensions)
  const body = buildLattice(spec)
  return Array.from({ length: count }, (_, replicate) => {
    const draw = stream(20_261_201, 'spare', 3, replicate)
    const mu = 0.4 + 0.4 * draw.uniform()
    const shift = 0.1 * draw.uniform()
    const lattice = varyLattice(body, {
      friction: spec.nodes.map(() => ({ forward: mu, backward: dimensions === 2 ? 1.4 * mu : mu })),
      phaseTurns: spec.actuators!.map(({ phaseTurns }) => phaseTurns + shift),
    })
    for (let i = 0; i < lattice.nodeCount; i++) {
      for (let axis = 0; axis < dimensions; axis++) {
        lattice.nodes[i * lattice.stride + dimensions + axis] = 0.01 * draw.normal()
      }
    }
    return lattice
  })
}

/** A body and its replicates as the C programs read them (lattice.c): doubles, one after the other. */
export function bytesForC(replicates: readonly Lattice[]): Uint8Array {
  const [body] = replicates as readonly [Lattice]
  const { dimensions, nodeCount, stride, passiveCount, activeCount, ends } = body
  const numbers: number[] = [
    ...[replicates.length, nodeCount, passiveCount, activeCount, body.groundColumns, body.groundRows],
    ...[body.contact[2]!, body.stepSeconds, body.dragNspm, body.angularRadps[0]!],
    ...[...body.gravity, ...body.terrain.slice(0, 5), ...body.contact.slice(0, 2)],
    ...[...body.heightsM, ...body.inverseMass],
  ]
  for (let i = 0; i < passiveCount + activeCount; i++) {
    numbers.push(ends[2 * i]! / stride, ends[2 * i + 1]! / stride)
    numbers.push(body.stiffnessNpm[i]!, body.stiffnessRestN[i]!, body.dampingNspm[i]!)
    numbers.push(i < passiveCount ? 0 : body.limitN[i - passiveCount]!)
    numbers.push(i < passiveCount ? 0 : body.powerMostW[i - passiveCount]!)
  }
  for (const { nodes, friction, strainCos, strainSin } of replicates) {
    for (let n = 0; n < nodeCount; n++) {
      numbers.push(...nodes.slice(n * stride, n * stride + 2 * dimensions))
      numbers.push(...friction.slice(dimensions * n, dimensions * (n + 1)))
    }
    for (let j = 0; j < activeCount; j++) numbers.push(strainCos[j]!, strainSin[j]!)
  }
  return new Uint8Array(Float64Array.from(numbers).buffer)
}
