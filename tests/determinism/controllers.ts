// Golden controllers: a rod of two guided struts over rough ground, driven by coupled oscillators and by recurrent
// networks that feel their strains, four replicates side by side in the kernel.

import { randomGenome } from '../../shared/encodings.js'
import { stream } from '../../shared/streams.js'
import {
  advanceLanesControlled,
  type Controller,
  phaseOscillators,
  type RecurrentDesign,
  recurrentFrom,
  recurrentParts,
} from '../../sim/controllers/index.js'
import { buildLattice } from '../../sim/lattice/build.js'
import { packLanes, unpackLane } from '../../sim/lattice/lanes.js'
import type { LatticeSpec } from '../../sim/lattice/spec.js'
import { varyLattice } from '../../sim/lattice/vary.js'

const seed = 20_261_209
const range = [-0.15, 0.15] as const
const stepSeconds = 0.02
const commands = 60

const rod: LatticeSpec = {
  nodes: [0, 0.1, 0.2].map((x) => ({
    positionM: [x, 0.002],
    massKg: 0.02,
    friction: { forward: 0.2, backward: 0.8 },
  })),
  struts: [],
  guided: [
    { a: 0, b: 1, stiffnessNpm: 80, dampingNspm: 0.1, actuator: 'unlimited' },
    { a: 1, b: 2, stiffnessNpm: 60, dampingNspm: 0.1, actuator: 'unlimited' },
  ],
  sensors: [
    { kind: 'strain', strut: 0, filterSeconds: 0.03 },
    { kind: 'contact', node: 2, filterSeconds: 0.02 },
  ],
  gravityMps2: [0, -9.81],
  ground: { firstXM: -0.5, spacingM: 0.05, heightsM: [0, 0.001, 0, 0.002, 0.001] },
  contact: { stiffness: 1500, damping: 800, exponent: 1.5, depthLimitM: 0.05 },
  stepSeconds: 2e-4,
}

const network: RecurrentDesign = {
  inputs: 2,
  neurons: 4,
  outputs: 2,
  timeConstantSeconds: [0.05, 1],
  weightMost: 12,
  biasMost: 5,
  range,
  stepSeconds,
}

const makers: { readonly [name: string]: (lane: number) => Controller } = {
  oscillators: (lane) =>
    phaseOscillators({
      frequenciesHz: [1.3, 1.7],
      links: [{ from: 0, to: 1, couplingPerSecond: 4, lagTurns: 0.25 }],
      feedback: [
        { oscillator: 0, input: 0, gainHz: 0.8 },
        { oscillator: 1, input: 1, gainHz: -0.3 },
      ],
      startTurns: [0.1 * lane, 0.3],
      amplitudes: [0.1, 0.12],
      range,
      stepSeconds,
    }),
  networks: (lane) => {
    const genome = randomGenome(recurrentParts(network), stream(seed, 'founder', 0, lane))
    const { timeConstant, bias, weights } = genome
    return recurrentFrom(network, { timeConstant: timeConstant!, bias: bias!, weights: weights! })
  },
}

export function controllerNumbers(): number[] {
  const body = buildLattice(rod)
  return Object.values(makers).flatMap((make) => {
    const controllers = [0, 1, 2, 3].map(make)
    const lanes = packLanes(controllers.map(() => varyLattice(body, {})))
    advanceLanesControlled(lanes, controllers, commands)
    return controllers.flatMap(({ state, outputs }, i) => {
      const { nodes, sensed, guidedStrain } = unpackLane(lanes, i)
      return [...nodes, ...sensed, ...guidedStrain, ...state, ...outputs]
    })
  })
}
