import { describe, expect, test } from 'vitest'
import { needsOf, needsWords, placesFor, usualNeeds } from './needs.js'

const there = { cores: 8, memoryMB: 16_000, tokens: { flow: 5, mesh: 1 } }

describe('places for simulations', () => {
  test.each([
    ['as many as cores', {}, 8],
    ['half as many where each takes two cores', { cores: 2 }, 4],
    ['a core is left over', { cores: 3 }, 2],
    ['as many as the memory holds', { memoryMB: 5_000 }, 3],
    ['as many as there are licences', { tokens: { flow: 2 } }, 2],
    ['of the scarcest of two licences', { tokens: { flow: 1, mesh: 1 } }, 1],
    ['none without a licence that is asked for', { tokens: { solver: 1 } }, 0],
    ['none on a machine too small', { cores: 9 }, 0],
  ])('%s', (_, needs, places) => {
    expect(placesFor(needsOf(needs), there)).toBe(places)
  })
})

test('what an author leaves out is as usual', () => {
  expect(needsOf(undefined)).toEqual(usualNeeds)
  expect(needsOf({ tokens: { flow: 1 } })).toEqual({ cores: 1, memoryMB: 1024, tokens: { flow: 1 } })
})

test('a person reads what a simulation takes', () => {
  expect(needsWords(usualNeeds)).toBe('1 core and 1,024 MB')
  expect(needsWords(needsOf({ cores: 2, memoryMB: 65_536, tokens: { flow: 1 } }))).toBe(
    '2 cores, 65,536 MB and 1 of licence flow',
  )
})
