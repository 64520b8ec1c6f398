// Network controllers against hand-worked examples, other arithmetic and published dynamics. Recurrent networks: Beer, On
// the dynamics of small continuous-time recurrent neural networks, 1995 (from memory; formulas derived again).

import { Matrix } from 'ml-matrix'
import { describe, expect, test } from 'vitest'
import { hex, sha256 } from '../../shared/digests.js'
import { checkGenome, randomGenome } from '../../shared/encodings.js'
import { Refusal } from '../../shared/refusals.js'
import { stream } from '../../shared/streams.js'
import { activations, logistic } from '../../sim/controllers/activations.js'
import { advanceLanesControlled } from '../../sim/controllers/controlled-lanes.js'
import {
  advanceControlled,
  type Controller,
  noInputs,
  stepsPerCommand,
} from '../../sim/controllers/controller.js'
import { feedForwardFrom, feedForwardParts, feedForwardWeights } from '../../sim/controllers/feed-forward.js'
import { openLoopFrom } from '../../sim/controllers/open-loop.js'
import { phaseOscillators } from '../../sim/controllers/phase-oscillators.js'
import { type RecurrentDesign, recurrentFrom, recurrentParts } from '../../sim/controllers/recurrent.js'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice } from '../../sim/lattice/build.js'
import { packLanes, unpackLane } from '../../sim/lattice/lanes.js'
import type { LatticeSpec } from '../../sim/lattice/spec.js'
import { varyLattice } from '../../sim/lattice/vary.js'
import { Solver } from '../tools/odex.js'
import { orderOf } from './physics-bodies.js'

const digest = (controller: Controller) =>
  hex(sha256(new Uint8Array(Float64Array.of(...controller.state, ...controller.outputs).buffer))).slice(0, 16)

describe('activations', () => {
  test('logistic: 1/2 at 0, symmetric, 0 and 1 far out', () => {
    expect(logistic(0)).toBe(0.5)
    expect(logistic(Math.log(3))).toBeCloseTo(0.75, 15)
    for (const x of [0.1, 1, 7]) expect(logistic(x) + logistic(-x)).toBeCloseTo(1, 15)
    expect([logistic(1e4), logistic(-1e4)]).toEqual([1, 0])
  })

  test('all agree with the host to the last digits', () => {
    for (const x of [-3, -0.2, 0, 0.7, 20]) {
      expect(activations.tanh.apply(x)).toBeCloseTo(Math.tanh(x), 14)
      expect(activations.logistic.apply(x)).toBeCloseTo(1 / (1 + Math.exp(-x)), 14)
      expect(activations.relu.apply(x)).toBe(Math.max(0, x))
      expect(activations.identity.apply(x)).toBe(x)
    }
  })
})

describe('feed-forward networks', () => {
  const design = {
    layers: [2, 2, 1],
    hidden: 'logistic',
    output: 'identity',
    weightMost: 4,
    range: [-1, 1],
    stepSeconds: 0.02,
  } as const

  test('exclusive or, worked by hand: relu(x + y) - 2 relu(x + y - 1)', () => {
    const network = feedForwardFrom({ ...design, hidden: 'relu' }, { weights: [0, 1, 1, -1, 1, 1, 0, 1, -2] })
    const answers = [
      [0, 0],
      [0, 1],
      [1, 0],
      [1, 1],
    ].map((inputs) => {
      network.step(inputs)
      return network.outputs[0]
    })
    expect(answers).toEqual([0, 1, 1, 0])
  })

  test('two hidden logistic neurons, worked by hand', () => {
    // Hidden sums 0.5 - 1 + 1.5 = 1 and -0.5 + 0.25 = -0.25; logistic 0.7310585786 and 0.4378234991 (tables);
    // output 0.1 + 0.7310585786 / 2 - 2 * 0.4378234991 = -0.4101177089.
    const network = feedForwardFrom(design, { weights: [0.5, -1, 3, -0.5, 0.25, 0, 0.1, 0.5, -2] })
    network.step([1, 0.5])
    expect(network.outputs[0]).toBeCloseTo(0.1 + 0.7310585786300049 / 2 - 2 * 0.43782349911420193, 14)
  })

  test('matrix products of ml-matrix give the same', () => {
    const deep = {
      ...design,
      layers: [3, 5, 4, 2],
      hidden: 'tanh',
      output: 'tanh',
      range: [-0.1, 0.3],
    } as const
    const source = stream(3, 'check')
    const weights = Array.from({ length: feedForwardWeights(deep) }, () => 4 * source.uniform() - 2)
    const inputs = [0.3, -1, 0.7]
    let values = Matrix.columnVector(inputs)
    let at = 0
    for (let layer = 1; layer < deep.layers.length; layer++) {
      const [rows, columns] = [deep.layers[layer]!, deep.layers[layer - 1]! + 1]
      const matrix = Matrix.from1DArray(rows, columns, weights.slice(at, at + rows * columns))
      at += rows * columns
      values = matrix.mmul(Matrix.columnVector([1, ...values.to1DArray()])).tanh()
    }
    const network = feedForwardFrom(deep, { weights })
    network.step(inputs)
    for (const [i, value] of values.to1DArray().entries()) {
      expect(network.outputs[i]).toBeCloseTo(0.1 + 0.2 * value, 13)
    }
  })

  test('commands stay within the range, whatever the weights', () => {
    const open = { ...design, output: 'relu', range: [0, 0.1] } as const
    const network = feedForwardFrom(open, { weights: [4, 4, 4, 4, 4, 4, 4, 4, 4] })
    network.step([100, 100])
    expect(network.outputs[0]).toBe(0.1)
  })

  test('a wrong number of weights, or one that is none, is refused', () => {
    expect(() => feedForwardFrom(design, { weights: [1] })).toThrow(Refusal)
    expect(() => feedForwardFrom(design, { weights: new Array<number>(9).fill(Number.NaN) })).toThrow(Refusal)
    expect(() => feedForwardFrom({ ...design, layers: [2] }, { weights: [] })).toThrow(Refusal)
  })
})

describe('continuous-time recurrent networks', () => {
  const one: RecurrentDesign = {
    inputs: 1,
    neurons: 1,
    outputs: 1,
    timeConstantSeconds: [0.1, 10],
    weightMost: 20,
    biasMost: 20,
    range: [0, 1],
    stepSeconds: 0.02,
  }
  const hold = (network: Controller, inputs: readonly number[], seconds: number) => {
    const steps = Math.round(seconds / network.stepSeconds)
    for (let i = 0; i < steps; i++) network.step(inputs)
    return network
  }

  test('a neuron without weights forgets as exp(-t / tau), with an error of fourth order', () => {
    const genes = { timeConstant: [0.5], bias: [0], weights: [0, 1] }
    const error = (stepSeconds: number) =>
      Math.abs(hold(recurrentFrom({ ...one, stepSeconds }, genes, [2]), [0], 1).state[0]! - 2 * Math.exp(-2))
    expect(Math.abs(orderOf(error(0.05), error(0.025)) - 4)).toBeLessThan(0.1)
  })

  // A neuron that excites itself with w > 4 has two stable states between the inputs
  //   I = +-(2 ln((sqrt w + sqrt(w - 4)) / 2) - sqrt(w (w - 4)) / 2) - w / 2 - theta        (Beer 1995, from memory)
  const edges = (w: number, theta: number) => {
    const half = Math.sqrt(w * (w - 4)) / 2 - 2 * Math.log((Math.sqrt(w) + Math.sqrt(w - 4)) / 2)
    return [-w / 2 - theta - half, -w / 2 - theta + half] as const
  }

  test.each([
    [6, -1],
    [10, 2],
    [20, 0],
  ])('self-weight %d, bias %d: two states within the edges, one outside', (w, theta) => {
    const genes = { timeConstant: [0.2], bias: [theta], weights: [w, 1] }
    const [left, right] = edges(w, theta)
    // Where a neuron ends that starts fully off or fully on.
    const ends = (input: number) =>
      [-10 * w, 10 * w].map((start) => hold(recurrentFrom(one, genes, [start]), [input], 60).outputs[0]!)
    const width = right - left
    for (const input of [left + 0.02 * width, (left + right) / 2, right - 0.02 * width]) {
      const [off, on] = ends(input)
      expect(on! - off!).toBeGreaterThan(0.1)
      // Both are fixed points: y = w s(y + theta) + I.
      for (const s of [off!, on!]) {
        const y = w * s + input
        expect(Math.abs(logistic(y + theta) - s)).toBeLessThan(1e-9)
      }
    }
    for (const input of [left - 0.02 * width, right + 0.02 * width]) {
      const [off, on] = ends(input)
      expect(Math.abs(on! - off!)).toBeLessThan(1e-6)
    }
  })

  test('self-weight below 4: one state at every input', () => {
    const genes = { timeConstant: [0.2], bias: [-1.9], weights: [3.8, 1] }
    const ends = [-50, 50].map((start) => hold(recurrentFrom(one, genes, [start]), [0], 60).outputs[0]!)
    expect(Math.abs(ends[1]! - ends[0]!)).toBeLessThan(1e-6)
  })

  describe('two neurons, each exciting itself with w, one exciting and the other inhibiting with c', () => {
    // At the centre crossing theta_i = -(sum of weights into i) / 2 the state y = -theta is a fixed point with the
    // eigenvalues (-1 + w/4 +- i c/4) / tau: a Hopf bifurcation at w = 4, frequency c / (8 pi tau).
    const [c, tau] = [6, 0.5]
    const pair: RecurrentDesign = { ...one, inputs: 0, neurons: 2, outputs: 2, stepSeconds: 0.01 }
    const network = (w: number) => {
      const bias = [-(w - c) / 2, -(w + c) / 2]
      const genes = { timeConstant: [tau, tau], bias, weights: [w, -c, c, w] }
      return recurrentFrom(pair, genes, [-bias[0]! + 0.05, -bias[1]!])
    }

    test('below w = 4 it comes to rest at its centre', () => {
      const { outputs } = hold(network(3.6), noInputs, 100)
      for (const output of outputs) expect(output).toBeCloseTo(0.5, 6)
    })

    test('just above it oscillates with that frequency', () => {
      const rhythm = hold(network(4.05), noInputs, 400)
      const crossings: number[] = []
      let before = rhythm.outputs[0]! - 0.5
      for (let i = 1; i <= 10_000; i++) {
        rhythm.step(noInputs)
        const now = rhythm.outputs[0]! - 0.5
        if (before < 0 && now >= 0) crossings.push(i - now / (now - before))
        before = now
      }
      const frequencyHz = (crossings.length - 1) / ((crossings.at(-1)! - crossings[0]!) * 0.01)
      // Off onset the frequency changes in proportion to w - 4.
      expect(Math.abs(frequencyHz / (c / (8 * Math.PI * tau)) - 1)).toBeLessThan(0.02)
      const further = Math.max(...rhythm.outputs.map((s) => Math.abs(s - 0.5)))
      expect(further).toBeGreaterThan(0.02)
    })
  })

  test('five neurons with held inputs: odex, another method of integration, agrees', () => {
    const design: RecurrentDesign = { ...one, inputs: 2, neurons: 5, outputs: 2, stepSeconds: 0.05 }
    const source = stream(8, 'check')
    const draw = (length: number, most: number) =>
      Array.from({ length }, () => most * (2 * source.uniform() - 1))
    const genes = {
      timeConstant: draw(5, 1).map((x) => 0.3 + 0.2 * x),
      bias: draw(5, 4),
      weights: draw(35, 8),
    }
    const network = recurrentFrom(design, genes)
    const inputs = [0.7, -1.1]
    const solver = new Solver(5)
    solver.absoluteTolerance = 1e-12
    solver.relativeTolerance = 1e-12
    const rates = (_: number, y: number[]) => {
      const firing = y.map((x, j) => 1 / (1 + Math.exp(-x - genes.bias[j]!)))
      return y.map((x, i) => {
        const into = firing
          .concat(inputs)
          .reduce((sum, value, j) => sum + value * genes.weights[7 * i + j]!, 0)
        return (into - x) / genes.timeConstant[i]!
      })
    }
    const { y } = solver.solve(rates, 0, [0, 0, 0, 0, 0], 3)
    hold(network, inputs, 3)
    for (let i = 0; i < 5; i++) expect(Math.abs(network.state[i]! - y[i]!)).toBeLessThan(1e-5)
  })

  test('genes of the wrong number, no time constant, and neurons too fast are refused', () => {
    const genes = { timeConstant: [0.2], bias: [0], weights: [1, 1] }
    expect(() => recurrentFrom(one, { ...genes, weights: [1] })).toThrow(Refusal)
    expect(() => recurrentFrom(one, { ...genes, timeConstant: [0] })).toThrow(Refusal)
    expect(() => recurrentFrom(one, { ...genes, timeConstant: [1e-9] })).toThrow(Refusal)
    expect(() => recurrentFrom({ ...one, outputs: 2 }, genes)).toThrow(Refusal)
  })
})

describe('from genomes', () => {
  const recurrent: RecurrentDesign = {
    inputs: 3,
    neurons: 4,
    outputs: 2,
    timeConstantSeconds: [0.05, 2],
    weightMost: 10,
    biasMost: 5,
    range: [-0.15, 0.15],
    stepSeconds: 0.02,
  }
  const forward = {
    layers: [3, 6, 2],
    hidden: 'tanh',
    output: 'tanh',
    weightMost: 3,
    range: [-0.15, 0.15],
    stepSeconds: 0.02,
  } as const
  const drive = (controller: Controller) => {
    for (let i = 0; i < 1000; i++) controller.step([(i % 7) / 8, (i % 50) / 32 - 1, i < 500 ? 1 : 0])
    return controller
  }

  test('founders are legal and keep their commands within the range', () => {
    const specs = { ...recurrentParts(recurrent), ...{ forward: feedForwardParts(forward).weights } }
    for (let seed = 1; seed <= 20; seed++) {
      const genome = randomGenome(specs, stream(seed, 'founder', 1)) as {
        [P in keyof typeof specs]: Float64Array
      }
      expect(checkGenome(specs, genome)).toBeUndefined()
      const both = [recurrentFrom(recurrent, genome), feedForwardFrom(forward, { weights: genome.forward })]
      for (const controller of both) {
        for (const output of drive(controller).outputs) expect(Math.abs(output)).toBeLessThanOrEqual(0.15)
      }
    }
  })

  test('the same bits everywhere: digests after 1,000 steps', () => {
    const spec = recurrentParts(recurrent)
    const genome = randomGenome(spec, stream(5, 'founder', 1)) as { [P in keyof typeof spec]: Float64Array }
    const weights = randomGenome(feedForwardParts(forward), stream(5, 'founder', 1)).weights!
    expect(digest(drive(recurrentFrom(recurrent, genome)))).toBe('7542e32efca5a628')
    expect(digest(drive(feedForwardFrom(forward, { weights })))).toBe('78c7e5410c6dd50b')
  })
})

describe('guiding a lattice', () => {
  const body = (parts: Partial<LatticeSpec>): LatticeSpec => ({
    nodes: [
      { positionM: [0, 0], massKg: 1, pinned: true },
      { positionM: [1, 0], massKg: 1 },
    ],
    struts: [],
    gravityMps2: [0, 0],
    stepSeconds: 1e-3,
    ...parts,
  })
  const strut = { a: 0, b: 1, stiffnessNpm: 100, dampingNspm: 1 }
  const ideal = { ...strut, actuator: 'unlimited' } as const

  test('an open-loop controller at every step moves a guided strut like its own drive does', () => {
    const driven = buildLattice(
      body({
        actuators: [{ ...strut, actuator: 'unlimited', group: 0, strain: 0.1, phaseTurns: 0.2 }],
        groups: [{ frequencyHz: 1.5 }],
      }),
    )
    const guided = buildLattice(body({ guided: [ideal] }))
    // A command is for the interval after the step that gives it, so it is one interval ahead of the drive's phase.
    const controller = openLoopFrom(
      {
        outputs: 1,
        frequencies: 'common',
        frequencyHz: [0.1, 9],
        range: [-0.2, 0.2],
        unit: 'strain',
        stepSeconds: 1e-3,
      },
      { frequency: [1.5], amplitude: [0.1], phase: [0.2 - 1.5e-3] },
    )
    expect(advance(driven, 3000)).toBeUndefined()
    expect(advanceControlled(guided, controller, 3000)).toBeUndefined()
    for (let i = 0; i < 4; i++)
      expect(Math.abs(guided.nodes[6 + i]! - driven.nodes[6 + i]!)).toBeLessThan(1e-10)
  })

  test('commands are held: 20 steps each, and the sensors of the lattice are what is sensed', () => {
    const sensed: number[] = []
    const guided = buildLattice(body({ guided: [ideal], sensors: [{ kind: 'strain', strut: 0 }] }))
    const outputs = new Float64Array(1)
    const controller: Controller = {
      stepSeconds: 0.02,
      inputCount: 1,
      outputs,
      state: new Float64Array(0),
      step: (inputs) => {
        sensed.push(inputs[0]!)
        outputs[0] = sensed.length === 1 ? 0.1 : 0
      },
    }
    advanceControlled(guided, controller, 2)
    expect(guided.step).toBe(40)
    expect(sensed[0]).toBe(0)
    expect(sensed[1]).toBeGreaterThan(0)
  })

  test('a command that is no number ends the simulation with its reason', () => {
    const guided = buildLattice(body({ guided: [ideal] }))
    const lost = phaseOscillators({
      frequenciesHz: [1],
      links: [],
      feedback: [{ oscillator: 0, input: 0, gainHz: 1 }],
      amplitudes: [0.1],
      range: [-0.1, 0.1],
      stepSeconds: 0.01,
    })
    const fault = advanceControlled(guided, lost, 10, (_, inputs) => inputs.fill(Number.NaN))
    expect(fault!.reason).toContain('no finite position')
  })

  test('four lanes under networks that feel give the bits of each replicate run alone', () => {
    const felt = { kind: 'strain', strut: 0, filterSeconds: 0.05 } as const
    const lattice = buildLattice(
      body({ struts: [strut], guided: [ideal, { ...ideal, stiffnessNpm: 50 }], sensors: [felt] }),
    )
    const design: RecurrentDesign = {
      inputs: 1,
      neurons: 3,
      outputs: 2,
      timeConstantSeconds: [0.05, 1],
      weightMost: 12,
      biasMost: 5,
      range: [-0.15, 0.15],
      stepSeconds: 0.02,
    }
    const genomes = [1, 2, 3, 4].map((seed) =>
      randomGenome(recurrentParts(design), stream(seed, 'founder', 1)),
    )
    const networks = () =>
      genomes.map(({ timeConstant, bias, weights }) =>
        recurrentFrom(design, { timeConstant: timeConstant!, bias: bias!, weights: weights! }),
      )
    const alone = networks().map((network) => {
      const one = varyLattice(lattice, {})
      expect(advanceControlled(one, network, 100)).toBeUndefined()
      return one
    })
    const lanes = packLanes([0, 1, 2, 3].map(() => varyLattice(lattice, {})))
    expect(advanceLanesControlled(lanes, networks(), 100)).toEqual([
      undefined,
      undefined,
      undefined,
      undefined,
    ])
    for (const [i, one] of alone.entries()) {
      expect(unpackLane(lanes, i).nodes).toEqual(one.nodes)
      expect(one.nodes[6]).not.toBe(1)
    }
    expect(alone[0]!.nodes).not.toEqual(alone[1]!.nodes)
  })

  test('an interval that is no whole number of steps, and a wrong number of commands, are refused', () => {
    expect(stepsPerCommand(0.02, 1e-3)).toBe(20)
    expect(() => stepsPerCommand(0.02, 3e-3)).toThrow(Refusal)
    const guided = buildLattice(body({ guided: [ideal, ideal] }))
    const single = openLoopFrom(
      {
        outputs: 1,
        frequencies: 'common',
        frequencyHz: [0.1, 9],
        range: [-1, 1],
        unit: '1',
        stepSeconds: 0.01,
      },
      { frequency: [1], amplitude: [1], phase: [0] },
    )
    expect(() => advanceControlled(guided, single, 1)).toThrow(Refusal)
    const unfelt = feedForwardFrom(
      { layers: [3, 2], hidden: 'tanh', output: 'tanh', weightMost: 1, range: [-1, 1], stepSeconds: 0.01 },
      { weights: new Array<number>(8).fill(0) },
    )
    expect(() => advanceControlled(guided, unfelt, 1)).toThrow(Refusal)
  })
})
