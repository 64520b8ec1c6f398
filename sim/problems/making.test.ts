// Every machine that comes with Skerry says what it is made of and what it is used for, and its founders can be made.

import { describe, expect, test } from 'vitest'
import { randomGenome } from '../../shared/encodings.js'
import { cautionsOf, undeclaredOf } from '../../shared/making/cautions.js'
import { partsFault, useFault } from '../../shared/making/declare.js'
import { makingFaults, makingFaultText } from '../../shared/making/makeability.js'
import { noMachine } from '../../shared/making/types.js'
import type { AnyProblem } from '../../shared/problem.js'
import { stream } from '../../shared/streams.js'
import { evaluateStrict } from '../evaluate.js'
import { asProblem } from '../problem.js'
import { classics } from './classic/index.js'
import { builtInProblems } from './index.js'

const load = async (folder: string): Promise<AnyProblem> =>
  asProblem((await import(/* @vite-ignore */ new URL(`${folder}/index.ts`, import.meta.url).href)).default)
const machines = Object.entries(builtInProblems).filter(([name]) => !(name in classics))

describe.each(machines)('%s', (_, { folder }) => {
  test('declares everything that a hazard asks for, with sound numbers', async () => {
    const problem = await load(folder)
    for (let i = 1; i <= 10; i++) {
      const genome = problem.repair(randomGenome(problem.genome, stream(20_261_201, 'founder', 1, i)))
      const { use } = problem
      expect(useFault(typeof use === 'function' ? use(genome) : use)).toBeUndefined()
      expect(undeclaredOf(problem, genome)).toEqual([])
      for (const { because, consult } of cautionsOf(problem, genome)) {
        expect(because).not.toMatch(/not declared|NaN|undefined|Infinity/)
        for (const text of [because, consult]) expect(text).not.toMatch(/\.$/)
      }
    }
  })

  test('has parts that hold against its process, most founders of which can be made; the others fail by name', async () => {
    const problem = await load(folder)
    const founders = 64
    let made = 0
    for (let i = 1; i <= founders; i++) {
      const genome = problem.repair(randomGenome(problem.genome, stream(20_261_201, 'founder', 1, i)))
      const parts = problem.parts!(genome)
      expect(partsFault(parts)).toBeUndefined()
      const [fault] = makingFaults(problem.process!, parts)
      if (!fault) made++
      else if (i <= 16) {
        const { failures } = evaluateStrict(problem, genome, 5, true, i, 0, 1)
        expect(failures[0]!.reason).toContain(`cannot be made: ${makingFaultText(fault)}`)
      }
    }
    expect(made).toBeGreaterThan(founders / 2)
  })
})

test('test functions say that they are no machines', async () => {
  for (const name of Object.keys(classics))
    expect((await load(builtInProblems[name]!.folder)).use).toBe(noMachine)
})
