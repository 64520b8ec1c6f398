import { describe, expect, it } from 'vitest'
import { editDistance, nearestName } from './nearest.js'

describe('the nearest name', () => {
  it('counts inserts, deletes, replacements and swaps of neighbours', () => {
    const pairs: [string, string, number][] = [
      ['', 'abc', 3],
      ['ring', 'rign', 1],
      ['kitten', 'sitting', 3],
      ['lookahed', 'lookahead', 1],
      ['same', 'same', 0],
    ]
    for (const [a, b, edits] of pairs) {
      expect(editDistance(a, b), `${a} ${b}`).toBe(edits)
      expect(editDistance(b, a), `${b} ${a}`).toBe(edits)
    }
  })
  it('ignores case and dashes, prefers the nearest, and stays silent when nothing is near', () => {
    const names = ['steady-state', 'generational', 'nsga-ii', 'drift', 'first', 'most']
    expect(nearestName('Steady_State', names)).toBe('steady-state')
    expect(nearestName('nsga2', names)).toBe('nsga-ii')
    expect(nearestName('frist', names)).toBe('first')
    expect(nearestName('bananas', names)).toBeUndefined()
    expect(nearestName('x', [])).toBeUndefined()
    expect(nearestName('y'.repeat(100_000), names)).toBeUndefined()
  })
})
