// A search file may name a problem that comes with the package, without a file of its own.

import { beforeAll, expect, it } from 'vitest'
import { Refusal } from '../../shared/refusals.js'
import { ensureBuilt } from '../../tests/tools/built.js'
import { bundleBuiltIn, isBuiltIn } from './bundle.js'
import { loadPlugin } from './load.js'

beforeAll(() => ensureBuilt(), 60_000)

it('bundles a problem by its name, with the same bytes every time', async () => {
  expect(isBuiltIn('skerry/problems/onemax')).toBe(true)
  expect(isBuiltIn('./problem.ts')).toBe(false)
  const one = await bundleBuiltIn('skerry/problems/onemax')
  const two = await bundleBuiltIn('skerry/problems/onemax')
  expect(two.digest).toBe(one.digest)
  expect(one.inputs).toContain('skerry/sim/problems/onemax/index.js')
  expect((await loadPlugin({ code: one.code })).name).toBe('onemax')
})

it('names the nearest ones where there is none of that name', async () => {
  const refusal = await bundleBuiltIn('skerry/problems/culvert-crawlr').catch((error) => error)
  expect(refusal).toBeInstanceOf(Refusal)
  expect(refusal).toMatchObject({ code: 'problem-not-found' })
  expect(refusal.cure).toMatch(/skerry\/problems\/culvert-crawler/)
})
