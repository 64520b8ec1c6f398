// Golden measurements: spectrum and tones of a made signal, natural modes and harmonic answers of a braced frame, and our
// own mathematical functions all over their ranges.

import * as functions from '../../shared/detmath/index.js'
import { stream } from '../../shared/streams.js'
import type { LatticeSpec } from '../../sim/lattice/spec.js'
import { fitTones, harmonicResponse, linearModel, naturalModes, spectrum } from '../../sim/measure/index.js'

const seed = 20_261_209

/** Two tones and noise, 400 samples. */
export function signalNumbers(): number[] {
  const draw = stream(seed, 'spare', 1)
  const sampleSeconds = 0.004
  const signal = Float64Array.from({ length: 400 }, (_, n) => {
    const turns = n * sampleSeconds * 2 * Math.PI
    return 0.8 * functions.sin(7.3 * turns) + 0.1 * functions.cos(31 * turns) + 0.02 * draw.normal()
  })
  const { tones, mean, residualRms } = fitTones(signal, sampleSeconds, [7.3, 31])
  return [
    ...(['hann', 'rectangle'] as const).flatMap((window) =>
      Array.from(spectrum(signal, sampleSeconds, window).amplitudes),
    ),
    ...tones.flatMap(({ amplitude, phaseTurns }) => [amplitude, phaseTurns]),
    mean,
    residualRms,
  ]
}

/** A braced frame of unequal masses and struts, held at its foot. */
function frame(): LatticeSpec {
  const draw = stream(seed, 'spare', 2)
  const columns = 4
  const nodes = Array.from({ length: 2 * columns }, (_, i) => ({
    positionM: [0.1 * Math.floor(i / 2), 0.12 * (i % 2)],
    massKg: 0.01 + 0.02 * draw.uniform(),
    pinned: i < 2,
  }))
  const struts = Array.from({ length: columns - 1 }, (_, i) => [
    [2 * i, 2 * i + 2],
    [2 * i + 1, 2 * i + 3],
    [2 * i, 2 * i + 3],
    [2 * i + 2, 2 * i + 3],
  ]).flatMap((pairs) =>
    pairs.map(([a, b]) => ({ a: a!, b: b!, stiffnessNpm: 500 + 500 * draw.uniform(), dampingNspm: 0.2 })),
  )
  return { nodes, struts, gravityMps2: [0, 0], stepSeconds: 'auto' }
}

export function modesNumbers(): number[] {
  const model = linearModel(frame())
  const { modes } = naturalModes(model)
  const forceN = new Float64Array(model.size)
  forceN[model.size - 1] = 1
  return [
    ...modes.flatMap(({ radps, dampingRatio, shape }) => [radps, dampingRatio, ...shape]),
    ...[2, 11, 40].flatMap((frequencyHz) => {
      const { real, imaginary } = harmonicResponse(model, frequencyHz, { forceN })
      return [...real, ...imaginary]
    }),
  ]
}

const ofOne = [
  ...['acos', 'asin', 'atan', 'atanh', 'cbrt', 'cos', 'cosh', 'acosh', 'asinh', 'exp', 'expm1', 'log'],
  ...['log10', 'log1p', 'log2', 'sin', 'sinh', 'tan', 'tanh'],
] as const
const ofTwo = ['atan2', 'hypot', 'pow'] as const

/** Every function of detmath at arguments of every size, in and outside of its domain. */
export function functionNumbers(): number[] {
  const draw = stream(seed, 'spare', 3)
  const arguments_ = Array.from({ length: 600 }, (_, i) => {
    const size = i % 3 === 0 ? 1 : i % 3 === 1 ? 30 : 2 ** (draw.below(600) - 300)
    return size * (2 * draw.uniform() - 1)
  })
  const table = functions as unknown as { readonly [name: string]: (x: number, y?: number) => number }
  return [
    ...ofOne.flatMap((name) => arguments_.map((x) => table[name]!(x))),
    ...ofTwo.flatMap((name) => arguments_.map((x, i) => table[name]!(x, arguments_[(7 * i + 3) % 600]!))),
  ]
}
