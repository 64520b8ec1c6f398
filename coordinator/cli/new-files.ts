// What `skerry new` writes: a search file with a comment on every field, and a small problem of its own. The machine is from
// the (invented) workshop of a town's water works: a sprung mount that keeps a pressure gauge readable on a pump's
// shaking discharge pipe.

/** The search file. `workers` is the number of simulations at once that the lookaheads are made for. */
export function searchText(name: string, workers: number): string {
  const islands = 4
  const lookahead = Math.max(2, Math.ceil((1.5 * workers) / islands))
  const population = Math.max(40, 2 * lookahead)
  // A hundred rounds: two replicates of three cases for each place of each lookahead.
  const simulations = Math.max(24_000, islands * lookahead * 6 * 100)
  return `# A search: what is evolved, how, and how much may be spent.
#   skerry check search.yaml    tries it without starting
#   skerry run search.yaml      starts it; the same command continues it after any interruption

name: ${name}
problem: ./problem.ts       # what is evolved, simulated and measured
seed: 1                     # another seed is another, equally good search
workersExpected: ${workers}          # simulations at once; the lookaheads below were made for it

budget:
  simulations: ${simulations}        # over all islands; a control has as much again
  # coreHours: 10           # further ends; the first one reached counts
  # until: 2030-01-31T18:00:00+01:00
  # target: 0.05            # of the first objective, in its unit
  # stagnation: 40 rounds   # without a better best

replicates:                 # simulations of one machine under different conditions
  first: 2                  # each machine
  topUp: 2                  # a promising one again, block by block
  most: 8
  conditions: shared        # shared: rivals meet the same conditions; own: each its own

islands:                    # sub-populations; several groups may have different methods
  - count: ${islands}
    method: steady-state
    population: ${population}
    lookahead: ${lookahead}            # evaluations under way on an island
    order: proposal         # proposal, cost or arrival: check says which fits
    settings:
      tournament: 3
    # operators:            # by part of the genome; sensible ones are chosen where nothing stands
    #   wire: { crossover: sbx, mutation: { operator: gaussian } }

migration:
  every: 20 rounds          # a round: each place of the lookahead does one unit of expectedCost (here 1 an evaluation)
  emigrants: 2
  topology: ring            # ring, two-way-ring, torus-4, torus-8, complete, random
  lag: 1

control:                    # the same budget without selection: what luck alone would find
  kind: drift               # drift, random-sampling, or a list of both; none to save the time
  budget: same

confirm: { fraction: 0.02 } # results simulated a second time elsewhere
genomes: survivors          # kept in the record: all, survivors or none
`
}

export const problemText = `// The mount of a pressure gauge: three coil springs and three pads between a shaking pump pipe and the gauge. A
// stiff mount shakes with the pipe, a soft one sags and resonates while the pump coasts down. All numbers are SI.
// The water works is invented; pad values are plausible guesses, not measurements.
//
// One upright degree of freedom, x: the gauge; y: the pipe.
//   m x'' = -k (x - y) - c (x' - y')        k = springs + pads, c = pads
//   springs: k = G d^4 / (8 D^3 n), wire d, coil D, n turns (close-coiled helical spring, any machine handbook)
// Math.sin and friends are replaced by versions that give the same bits on every machine.

import { choice, defineProblem, integer, making, real } from 'skerry'

const shearModulusPa = 79e9 // spring steel
const densityKgpm3 = 7850
// Wire that can be bought: rows of the table of stock, each with a name, a diameter and lengths it is cut to.
const wires = making.springWires.filter(({ wallM }) => wallM >= 0.0008)
const pads = [
  { name: 'felt', stiffnessNpm: 60, dampingNspm: 1.5 },
  { name: 'cork', stiffnessNpm: 500, dampingNspm: 4 },
  { name: 'neoprene', stiffnessNpm: 180, dampingNspm: 7 },
]
const padCount = 3
const springCount = 3
const gravityMps2 = 9.81
const seconds = 4
const stepSeconds = 0.0004
const travelMostM = 0.004
const sagMostM = 0.012
const heaviestKg = 1.3
const stressMostPa = 450e6

interface Condition {
  readonly gaugeKg: number
  readonly pipeMotionM: number
  readonly speedFactor: number
}

/** Pump speed in turns a second at a time of each case. */
const speeds: { readonly [name: string]: (timeSeconds: number) => number } = {
  idle: () => 12,
  full_speed: () => 25,
  coasting_down: (timeSeconds) => 25 - (20 * timeSeconds) / seconds,
}

type Build = { readonly wire: Float64Array; readonly coil: Float64Array; readonly turns: Int32Array; readonly pad: Int32Array }

function mountOf(build: Build) {
  const wireM = build.wire[0]!
  const coilM = build.coil[0]!
  const turns = build.turns[0]!
  const pad = pads[build.pad[0]!]!
  const springNpm = (shearModulusPa * wireM ** 4) / (8 * coilM ** 3 * turns)
  return {
    wireM,
    coilM,
    springNpm,
    stiffnessNpm: springCount * springNpm + padCount * pad.stiffnessNpm,
    dampingNspm: padCount * pad.dampingNspm,
    springKg: springCount * densityKgpm3 * ((Math.PI * wireM ** 2) / 4) * Math.PI * coilM * turns,
  }
}

/** Gauge and pipe over time, with the acceleration of the gauge. */
function shake(build: Build, condition: Condition, name: string, see: (xM: number, yM: number, aMps2: number) => void) {
  const { stiffnessNpm, dampingNspm } = mountOf(build)
  let xM = 0
  let vMps = 0
  let turn = 0
  for (let step = 0; step * stepSeconds < seconds; step++) {
    const hertz = speeds[name]!(step * stepSeconds) * condition.speedFactor
    turn += hertz * stepSeconds
    const phase = 2 * Math.PI * (turn - Math.floor(turn))
    const yM = condition.pipeMotionM * Math.sin(phase)
    const yMps = condition.pipeMotionM * 2 * Math.PI * hertz * Math.cos(phase)
    const aMps2 = (stiffnessNpm * (yM - xM) + dampingNspm * (yMps - vMps)) / condition.gaugeKg
    vMps += aMps2 * stepSeconds // velocity first, then position: stable without further care
    xM += vMps * stepSeconds
    see(xM, yM, aMps2)
  }
}

export default defineProblem({
  name: 'gauge-mount',
  version: '1',
  summary: 'a sprung mount that keeps a pressure gauge readable on a shaking pump pipe',
  genome: {
    wire: real({ length: 1, low: 0.0008, high: 0.003, scale: 'log', unit: 'm' }),
    coil: real({ length: 1, low: 0.006, high: 0.04, scale: 'log', unit: 'm' }),
    turns: integer({ length: 1, low: 3, high: 14 }),
    pad: choice({ length: 1, options: pads.map(({ name }) => name) }),
  },
  // Situations that every mount must face; the worst counts.
  cases: Object.keys(speeds),
  objectives: { shaking: { direction: 'minimise', unit: 'm/s2', reduce: 'mean', overCases: 'worst' } },
  measures: {
    travel: { low: 0, high: 0.02, unit: 'm' },
    sag: { low: 0, high: 0.05, unit: 'm' },
    springs: { low: 0, high: 2, unit: 'kg' },
  },
  drawCondition: (stream): Condition => ({
    gaugeKg: heaviestKg - 0.4 * stream.uniform(),
    pipeMotionM: 0.0002 + 0.0002 * stream.uniform(),
    speedFactor: 0.97 + 0.06 * stream.uniform(),
  }),
  // Wire that can be bought, and a coil that can be wound from it: 4 to 16 diameters wide.
  repair: (genome) => {
    const wireM = making.nearestRow(genome.wire[0]!, wires).wallM
    const [leastM, mostM] = [Math.max(0.006, 4 * wireM), Math.min(0.04, 16 * wireM)]
    return { ...genome, wire: Float64Array.of(wireM), coil: making.clamped(genome.coil, leastM, mostM) }
  },
  // What the workshop can make, and what a genome asks for: what cannot be made fails by name, and check counts it.
  process: {
    name: 'coil springs wound in the workshop, pads glued on',
    methods: ['cutting-to-length', 'gluing'],
    stock: wires,
    actuators: [],
    massMostKg: 2,
  },
  parts: (genome) => ({
    struts: [1, 2, 3].map((number) => ({
      name: 'spring ' + number,
      stock: making.nearestRow(genome.wire[0]!, wires).name,
      lengthM: Math.PI * genome.coil[0]! * genome.turns[0]!,
    })),
    massKg: heaviestKg + mountOf(genome).springKg,
  }),
  simulate: (genome, situations) =>
    situations.map(({ condition, case: name }) => {
      const mount = mountOf(genome)
      // Sag is laid out for the heaviest gauge, whichever hangs there now.
      const sagM = (heaviestKg * gravityMps2) / mount.stiffnessNpm
      if (sagM > sagMostM) return { failed: 'the gauge sags onto its bracket' }
      let squares = 0
      let steps = 0
      let travelM = 0
      shake(genome, condition, name, (xM, yM, aMps2) => {
        squares += aMps2 * aMps2
        steps += 1
        travelM = Math.max(travelM, Math.abs(xM - yM))
      })
      const springN = mount.springNpm * (sagM + travelM)
      const stressPa = (8 * springN * mount.coilM) / (Math.PI * mount.wireM ** 3)
      if (travelM > travelMostM) return { failed: 'the gauge strikes its stops' }
      if (stressPa > stressMostPa) return { failed: 'the wire is stressed beyond its limit' }
      return {
        objectives: { shaking: Math.sqrt(squares / steps) },
        measures: { travel: travelM, sag: sagM, springs: mount.springKg },
      }
    }),
  // For picture and replay: the pipe below, the gauge above, motion shown 40 times as large.
  frames: (genome, { condition, case: name }) => {
    const positions: Float64Array[] = []
    let step = 0
    shake(genome, condition, name, (xM, yM) => {
      if (step++ % 50 !== 0) return
      const pipe = 0.02 + 40 * yM
      const gauge = 0.08 + 40 * xM
      positions.push(Float64Array.of(-0.03, pipe, 0, pipe, 0.03, pipe, -0.03, gauge, 0, gauge, 0.03, gauge))
    })
    return {
      dimensions: 2,
      secondsPerFrame: 50 * stepSeconds,
      positions,
      links: [
        { a: 0, b: 1, kind: 'pipe' },
        { a: 1, b: 2, kind: 'pipe' },
        { a: 3, b: 4, kind: 'gauge plate' },
        { a: 4, b: 5, kind: 'gauge plate' },
        ...[0, 1, 2].map((a) => ({ a, b: a + 3, kind: 'spring' })),
      ],
      nodeRadiiM: [0.002, 0.002, 0.002, 0.002, 0.002, 0.002],
      ground: [[-0.08, 0], [0.08, 0]],
      markers: [{ node: 4, label: 'gauge (motion shown 40 times)', radiusM: 0.012 }],
      drive: [],
    }
  },
  describe: (genome) => [
    'wire ' + (genome.wire[0]! * 1000).toFixed(2) + ' mm, coil ' + (genome.coil[0]! * 1000).toFixed(1) + ' mm, ' + genome.turns[0] + ' turns',
    'three springs of ' + (mountOf(genome).springNpm / 1000).toFixed(2) + ' kN/m, pads of ' + pads[genome.pad[0]!]!.name,
  ],
  // From these numbers follow the cautions that leave with every picture, replay and summary. What is not declared is
  // cautioned against: declare 0, 'none' or false only where you know it.
  use: (genome) => ({
    places: ['pump-room'],
    wetted: 'nothing',
    energy: ['shaken-support'],
    gasPressurePa: 0,
    liquidPressurePa: 600e3, // in the line that the gauge reads
    // Springs with the heaviest gauge on them, at the end of their travel.
    storedElasticJ: (springCount * mountOf(genome).springNpm * (sagMostM + travelMostM) ** 2) / 2,
    suspendedKg: heaviestKg,
    suspendedHeightM: 1.5,
    movingParts: false,
    rotationHz: 0,
    voltageV: 0,
    battery: 'none',
    hottestC: 40,
    onRunningMachine: true,
    vibrationHz: 25,
    upstreamOfPump: false,
  }),
  // Beyond those that follow from the above.
  cautions: () => [
    {
      hazard: 'A gauge that misleads',
      because: 'a gauge that shakes or sags can show a wrong pressure',
      consult: 'the gauge maker\\'s data sheet, and a second gauge before anything is decided by this one',
    },
  ],
})
`
