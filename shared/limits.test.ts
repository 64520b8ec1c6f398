import { expect, test } from 'vitest'
import { idOf, nameOf, numberOf, parseName } from './ids.js'
import { limits } from './limits.js'

test('the largest island and the last individual still have a name that reads back', () => {
  const id = idOf(limits.islandsMost, limits.simulationsMost)
  expect(Number.isSafeInteger(id)).toBe(true)
  expect(numberOf(id)).toBe(limits.simulationsMost)
  expect(parseName(nameOf(id))).toBe(id)
})

test('a name that is no id is not one', () => {
  expect(parseName('i0-00001')).toBeUndefined()
  expect(parseName('i3-1')).toBeUndefined()
  expect(parseName('i3-01842')).toBe(idOf(3, 1842))
})
