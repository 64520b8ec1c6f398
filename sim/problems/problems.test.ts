import { readdirSync } from 'node:fs'
import { describe, expect, test } from 'vitest'
import { randomGenome } from '../../shared/encodings.js'
import type { AnyProblem } from '../../shared/problem.js'
import { stream } from '../../shared/streams.js'
import { evaluateStrict } from '../evaluate.js'
import { asProblem } from '../problem.js'
import { classicProblem, classics, noiseSd } from './classic/index.js'
import { builtInProblems } from './index.js'

const load = async (folder: string): Promise<AnyProblem> =>
  asProblem((await import(/* @vite-ignore */ new URL(`${folder}/index.ts`, import.meta.url).href)).default)

describe('the table of problems', () => {
  test('has every folder that holds one', () => {
    const folders = readdirSync(import.meta.dirname, { withFileTypes: true })
      .filter((entry) => entry.isDirectory() && entry.name !== 'classic')
      .map((entry) => entry.name)
    expect(Object.keys(builtInProblems).sort()).toEqual(folders.sort())
  })

  test.each(Object.entries(builtInProblems))('%s loads under its name and simulates', async (name, row) => {
    const problem = await load(row.folder)
    expect(problem.name).toBe(name)
    expect(problem.summary).toBe(row.summary)
    const genome = problem.repair(randomGenome(problem.genome, stream(11, 'founder', 1, 1)))
    const { faults, values } = evaluateStrict(problem, genome, 5, true, 1, 0, 2)
    expect(faults).toEqual([])
    expect(values.every(Number.isFinite)).toBe(true)
    expect(problem.expectedCost(genome)).toBeGreaterThanOrEqual(1)
  })
})

describe('classic test functions as problems', () => {
  test('a size can be asked for', () => {
    const problem = classicProblem('zdt4', 5)
    expect(problem.genome.others).toMatchObject({ length: 4, low: -5, high: 5 })
  })

  test('a size that cannot be is refused with the least one', () => {
    expect(() => classicProblem('dtlz2', 2)).toThrow(/size 2, expected a whole number of at least 3/)
    expect(() => classicProblem('onemax', 2.5)).toThrow(/size 2.5/)
  })

  test('the noise of noisy-sphere is normal with the stated deviation', () => {
    // Common practice, no source: mean and variance of 4,000 draws within 4 standard errors.
    const problem = classicProblem('noisy-sphere')
    const n = 4_000
    const { values } = evaluateStrict(problem, { x: new Float64Array(10) }, 20_261_201, true, 1, 0, n)
    const mean = values.reduce((a, b) => a + b) / n
    const variance = values.reduce((a, b) => a + (b - mean) * (b - mean), 0) / (n - 1)
    expect(Math.abs(mean)).toBeLessThan((4 * noiseSd) / Math.sqrt(n))
    expect(Math.abs(variance / (noiseSd * noiseSd) - 1)).toBeLessThan(4 * Math.sqrt(2 / (n - 1)))
  })

  test('every row names a source', () => {
    for (const row of Object.values(classics)) expect(row.source).toMatch(/\d{4}/)
  })
})
