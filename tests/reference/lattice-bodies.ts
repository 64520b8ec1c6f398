// Random lattices that use every law at once, in the plane and in space, and variations of them: for tests that
// compare one way of moving them with another.

import type { Stream } from '../../shared/streams.js'
import type {
  ActuatorSpec,
  DriveGroupSpec,
  GroundSpec,
  GuidedSpec,
  LatticeSpec,
  NodeSpec,
  SensorSpec,
  StrutSpec,
} from '../../sim/lattice/spec.js'
import type { Variation } from '../../sim/lattice/vary.js'

const spacingM = 0.05

/** A block of cells with every law: passive, active and guided struts, sensors, drag, fills, pairs, ground, a moved node. */
export function randomBody(draw: Stream, dimensions: 2 | 3): LatticeSpec {
  const between = (low: number, high: number) => low + draw.uniform() * (high - low)
  const size = dimensions === 2 ? [3 + draw.below(4), 2 + draw.below(3)] : [3 + draw.below(2), 2, 2]
  const [columns, rows, layers = 1] = size as [number, number, number?]
  const number = (i: number, j: number, k = 0) => (k * rows + j) * columns + i
  const nodes = randomNodes(draw, dimensions, [columns, rows, layers])
  const pairs = neighbours(draw, columns, rows, layers)
  const strut = ([a, b]: readonly [number, number]): StrutSpec => {
    const stiffnessNpm = between(80, 300)
    return { a, b, stiffnessNpm, dampingNspm: stiffnessNpm * between(0.0002, 0.0006) }
  }
  const kinds = pairs.map(() => draw.below(10))
  const of = (low: number, high: number) =>
    pairs.filter((_, i) => kinds[i]! >= low && kinds[i]! < high).map(strut)
  const groups = randomGroups(draw)
  const sensors = randomSensors(draw, nodes.length, pairs.length)
  return {
    dimensions,
    nodes,
    struts: of(0, 6),
    actuators: of(6, 8).map((one) => randomActuator(draw, one, groups.length)),
    guided: of(8, 10).map((one) => randomGuided(draw, one, groups.length, sensors.length)),
    sensors,
    dragStruts: pairs
      .filter((_, i) => i % 4 === 0)
      .map(([a, b]) => {
        const tangentNspm2 = between(0.01, 0.1)
        return { a, b, tangentNspm2, normalNspm2: tangentNspm2 * between(1.2, 2) }
      }),
    ...(dimensions === 2
      ? {
          areas: [
            { nodes: [number(0, 0), number(1, 0), number(0, 1)] as const, stiffnessNpm: between(20, 60) },
          ],
        }
      : {
          volumes: [
            {
              nodes: [number(0, 0, 0), number(1, 0, 0), number(0, 1, 0), number(0, 0, 1)] as const,
              stiffnessPa: between(200, 600),
            },
          ],
        }),
    keepApart: [{ a: 0, b: nodes.length - 1, leastM: between(0.1, 0.3), stiffnessNpm: between(20, 60) }],
    groups,
    prescribed: [
      {
        node: number(columns - 1, rows - 1, layers - 1),
        group: 0,
        amplitudeM: Array.from({ length: dimensions }, () => between(-0.002, 0.002)),
        phaseTurns: draw.uniform(),
      },
    ],
    gravityMps2:
      dimensions === 2 ? [between(-0.3, 0.3), -9.81] : [between(-0.3, 0.3), -9.81, between(-0.3, 0.3)],
    dragNspm: between(0, 0.02),
    ground: randomGround(draw, dimensions),
    contact: { stiffness: 1500, damping: 800, exponent: draw.chance(1, 2) ? 1 : 1.5, depthLimitM: 0.02 },
    drive: draw.chance(1, 2)
      ? { startSeconds: 0.02, rampSeconds: 0.05 }
      : { startSeconds: 0, rampSeconds: 0 },
    stepSeconds: 1e-4,
  }
}

function randomNodes(draw: Stream, dimensions: 2 | 3, size: readonly number[]): NodeSpec[] {
  const [columns, rows, layers] = size as [number, number, number]
  const between = (low: number, high: number) => low + draw.uniform() * (high - low)
  const nodes: NodeSpec[] = []
  const count = columns * rows * layers
  for (let k = 0; k < layers; k++)
    for (let j = 0; j < rows; j++)
      for (let i = 0; i < columns; i++) {
        const place = [i, j, k].map((n) => n * spacingM + between(-0.005, 0.005))
        const positionM = [place[0]!, place[1]! + 0.008, place[2]!].slice(0, dimensions)
        const friction = frictionOf(draw)
        const ahead = (nodes.length + 1) % count
        nodes.push({
          positionM,
          velocityMps: positionM.map(() => between(-0.2, 0.2)),
          massKg: between(0.006, 0.012),
          pinned: draw.chance(1, 30),
          ...(friction ? { friction } : {}),
          ...(dimensions === 3 && draw.chance(1, 2) ? { headingNode: ahead } : {}),
        })
      }
  return nodes
}

function frictionOf(draw: Stream) {
  const between = (low: number, high: number) => low + draw.uniform() * (high - low)
  const all = between(0.2, 0.8)
  const kind = draw.below(4)
  if (kind === 0) return undefined
  if (kind === 1) return { forward: all, backward: all, sideways: all }
  return { forward: all, backward: between(0.2, 1.2), sideways: between(0.2, 1) }
}

/** Pairs of nodes of neighbouring cells, each once, in random order. */
function neighbours(
  draw: Stream,
  columns: number,
  rows: number,
  layers: number,
): (readonly [number, number])[] {
  const pairs: (readonly [number, number])[] = []
  const number = (i: number, j: number, k: number) => (k * rows + j) * columns + i
  for (let k = 0; k < layers; k++)
    for (let j = 0; j < rows; j++)
      for (let i = 0; i < columns; i++)
        for (const [di, dj, dk] of [
          [1, 0, 0],
          [0, 1, 0],
          [0, 0, 1],
          [1, 1, 0],
          [-1, 1, 0],
          [1, 0, 1],
          [0, 1, 1],
          [1, 1, 1],
        ] as const) {
          const [a, b, c] = [i + di, j + dj, k + dk]
          if (a < 0 || a >= columns || b >= rows || c >= layers) continue
          pairs.push([number(i, j, k), number(a, b, c)])
        }
  return Array.from(draw.permutation(pairs.length), (i) => pairs[i]!)
}

function randomGroups(draw: Stream): DriveGroupSpec[] {
  const between = (low: number, high: number) => low + draw.uniform() * (high - low)
  return [
    { frequencyHz: between(1, 3), lagSeconds: between(0, 0.05) },
    { frequencyHz: between(0.5, 2), sweep: { toHz: between(4, 8), seconds: between(0.05, 0.12) } },
  ]
}

function randomSensors(draw: Stream, nodes: number, struts: number): SensorSpec[] {
  return Array.from({ length: 3 }, (_, i): SensorSpec => {
    const filterSeconds = 0.002 + 0.02 * draw.uniform()
    return i === 0
      ? { kind: 'contact', node: draw.below(Math.min(nodes, 3)), filterSeconds }
      : { kind: 'strain', strut: draw.below(struts), filterSeconds }
  })
}

function randomActuator(draw: Stream, strut: StrutSpec, groups: number): ActuatorSpec {
  return {
    ...strut,
    group: draw.below(groups),
    strain: 0.02 + 0.1 * draw.uniform(),
    phaseTurns: draw.uniform(),
    ...(draw.chance(1, 2) ? { forceLimitN: 0.1 + draw.uniform() } : { actuator: 'unlimited' }),
    ...(draw.chance(1, 2) ? { powerLimitW: 0.001 + 0.01 * draw.uniform() } : {}),
  }
}

function randomGuided(draw: Stream, strut: StrutSpec, groups: number, sensors: number): GuidedSpec {
  const driven = draw.chance(1, 2)
  return {
    ...strut,
    ...(driven
      ? { group: draw.below(groups), strain: 0.1 * draw.uniform(), phaseTurns: draw.uniform() }
      : {}),
    feedback: Array.from({ length: draw.below(3) }, () => {
      return { sensor: draw.below(sensors), gain: 0.2 * (draw.uniform() - 0.5) }
    }),
    forceLimitN: 0.2 + draw.uniform(),
    strainLimit: 0.05 + 0.1 * draw.uniform(),
    strainRateLimitPerSecond: 0.5 + draw.uniform(),
    powerLimitW: 0.001 + 0.02 * draw.uniform(),
  }
}

export function randomGround(draw: Stream, dimensions: 2 | 3): GroundSpec {
  const rows = dimensions === 3 ? 6 : 1
  const heightsM = Array.from({ length: 12 * rows }, () => 0.004 * draw.uniform())
  return dimensions === 3
    ? { firstXM: -0.1, spacingM: 0.03, heightsM, rows, firstZM: -0.05, spacingZM: 0.025 }
    : { firstXM: -0.1, spacingM: 0.03, heightsM }
}

/** Another situation of such a body. With `parts`, every strut differs too. */
export function randomVariation(draw: Stream, spec: LatticeSpec, parts: boolean): Variation {
  const dimensions = spec.dimensions ?? 2
  const struts = spec.struts.length + (spec.actuators?.length ?? 0) + (spec.guided?.length ?? 0)
  return {
    ground: randomGround(draw, dimensions),
    friction: spec.nodes.map(() => frictionOf(draw)),
    phaseTurns: Array.from({ length: (spec.actuators?.length ?? 0) + (spec.guided?.length ?? 0) }, () =>
      draw.uniform(),
    ),
    dragNspm: 0.02 * draw.uniform(),
    ...(parts ? { strutFactors: Array.from({ length: struts }, () => 0.9 + 0.2 * draw.uniform()) } : {}),
  }
}
