import { expect, test } from 'vitest'
import { Refusal } from '../../../shared/refusals.js'
import type { SearchPlan } from '../../evolution/plan.js'
import { dispatcherHere } from './here.js'

function slots(needs: SearchPlan['problem']['needs'], cores: number, tokens = {}): number {
  const plan = { seed: 1, replicates: { shared: true }, problem: { needs } } as unknown as SearchPlan
  return dispatcherHere({ pluginFile: 'plugin.mjs', plan, cores, tokens }).status().slots
}

test('as many at once as cores where nothing is said, else as there is room and licences for', () => {
  expect(slots(undefined, 5)).toBe(5)
  expect(slots({ cores: 2, memoryMB: 10, tokens: {} }, 5)).toBe(2)
  expect(slots({ cores: 1, memoryMB: 10, tokens: { flow: 2 } }, 8, { flow: 7 })).toBe(3)
})

test('a machine without room for one is told so, with what it has', () => {
  const refused = (needs: SearchPlan['problem']['needs'], tokens = {}) => {
    try {
      slots(needs, 2, tokens)
    } catch (error) {
      if (error instanceof Refusal) return error
    }
    throw new Error('was not refused')
  }
  const wide = refused({ cores: 3, memoryMB: 10, tokens: {} })
  expect(wide.code).toBe('machine-too-small')
  expect(wide.detail).toMatch(/takes 3 cores and 10 MB; here there are 2 cores and [\d,]+ MB/)
  expect(refused({ cores: 1, memoryMB: 4_194_304, tokens: {} }).detail).toContain('4,194,304 MB')
  expect(refused({ cores: 1, memoryMB: 10, tokens: { flow: 2 } }, { flow: 1 }).detail).toContain(
    '1 of licence flow',
  )
})
