// What a plug-in takes along of the measuring tools and controllers: only what it uses, and with the same bits.

import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { evaluate } from '../../sim/evaluate.js'
import { naturalModes } from '../../sim/measure/modes.js'
import { dominantTone } from '../../sim/measure/spectrum.js'
import { bundlePlugin } from '../../worker/plugin/bundle.js'
import { loadPlugin } from '../../worker/plugin/load.js'
import { ensureBuilt } from '../tools/built.js'

const folder = mkdtempSync(join(tmpdir(), 'skerry-measure-'))
beforeAll(() => ensureBuilt(), 60_000)
afterAll(() => rmSync(folder, { recursive: true, force: true }))

const plugin = (imports: string, expression: string) => `
  import { defineProblem, real${imports} } from 'skerry'
  export default defineProblem({
    name: 'probe', version: '1', summary: 'a test', genome: { x: real({ low: 0, high: 10 }) },
    objectives: { value: { direction: 'maximise', unit: '1' } },
    drawCondition: (stream) => stream.uniform(),
    simulate: (genome, situations) => situations.map(() => {
      const x: number = genome.x[0]!
      return { objectives: { value: ${expression} } }
    }),
  })`

async function bundled(name: string, imports: string, expression: string) {
  const file = join(folder, `${name}.ts`)
  writeFileSync(file, plugin(imports, expression))
  const { code } = await bundlePlugin(file)
  const result = evaluate(await loadPlugin({ code }), { x: Float64Array.of(2) }, 1, true, 1, 0, 1)
  expect(result.failures).toEqual([])
  return { code, value: result.values[0]! }
}

// Marks of the two packages that only parts of sim/measure need.
const hasFft = (code: string) => code.includes('realTransform')
const hasMatrix = (code: string) => code.includes('EigenvalueDecomposition')

test('a problem that measures nothing carries nothing of it', async () => {
  const plain = await bundled('plain', '', 'x')
  expect([hasFft(plain.code), hasMatrix(plain.code)]).toEqual([false, false])
  expect(plain.code).not.toContain('homogenise')
  expect(plain.code).not.toContain('commonPerSecond')
})

test('tools without a package stay small, and controllers too', async () => {
  const plain = await bundled('nothing', '', 'x')
  const cell = await bundled(
    'cell',
    ', homogenise, planeConstants',
    `planeConstants(homogenise({ vectorsM: [[1, 0], [0.5, 0.8]], nodes: [{ positionM: [0, 0] }], struts: [
      { a: 0, b: 0, shift: [1, 0], stiffnessNpm: x }, { a: 0, b: 0, shift: [0, 1], stiffnessNpm: 1 },
      { a: 0, b: 0, shift: [-1, 1], stiffnessNpm: 1 }] }).stiffness).E1`,
  )
  const controlled = await bundled(
    'controlled',
    ', phaseOscillators',
    `(() => { const c = phaseOscillators({ frequenciesHz: [x], links: [], amplitudes: [1], range: [-1, 1],
      stepSeconds: 0.1 }); c.step([]); return c.outputs[0]! })()`,
  )
  for (const { code } of [cell, controlled]) {
    expect([hasFft(code), hasMatrix(code)]).toEqual([false, false])
    expect(code.length - plain.code.length).toBeLessThan(40_000)
  }
})

test('a spectrum brings fft.js and not ml-matrix, modes the other way round; both give the bits they give here', async () => {
  const samples = Float64Array.from({ length: 300 }, (_, n) => ((n * n * 31) % 97) / 8)
  const tone = await bundled(
    'tone',
    ', dominantTone',
    'dominantTone(Float64Array.from({ length: 300 }, (_, n) => ((n * n * 31) % 97) / 8), x)!.frequencyHz',
  )
  expect([hasFft(tone.code), hasMatrix(tone.code)]).toEqual([true, false])
  expect(tone.value).toBe(dominantTone(samples, 2)!.frequencyHz)
  const lattice = (x: number) => ({
    nodes: [0, 1, 2, 3].map((i) => ({ positionM: [i, (i * i) / 8], massKg: 1 + i })),
    struts: [0, 1, 2].map((a) => ({ a, b: a + 1, stiffnessNpm: x + a, dampingNspm: 0 })),
    gravityMps2: [0, 0],
    stepSeconds: 'auto' as const,
  })
  const modes = await bundled(
    'modes',
    ', naturalModes',
    `naturalModes({
      nodes: [0, 1, 2, 3].map((i) => ({ positionM: [i, (i * i) / 8], massKg: 1 + i })),
      struts: [0, 1, 2].map((a) => ({ a, b: a + 1, stiffnessNpm: x + a, dampingNspm: 0 })),
      gravityMps2: [0, 0], stepSeconds: 'auto',
    }).modes[7]!.radps`,
  )
  expect([hasFft(modes.code), hasMatrix(modes.code)]).toEqual([false, true])
  expect(modes.value).toBe(naturalModes(lattice(2)).modes[7]!.radps)
})
