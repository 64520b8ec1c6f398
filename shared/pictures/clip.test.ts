// Lines cut at edges and freed of superfluous points.

import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { clippedLine, withoutStraightPoints } from './clip.js'

const rectangle = { leftPx: 0, topPx: 0, widthPx: 10, heightPx: 10 }

describe('cutting', () => {
  it('keeps what is inside, cuts at the edges and drops the rest', () => {
    expect(clippedLine([2, 2, 8, 8], rectangle)).toEqual([[2, 2, 8, 8]])
    expect(clippedLine([-5, 5, 15, 5], rectangle)).toEqual([[0, 5, 10, 5]])
    expect(clippedLine([-5, -5, -1, 20], rectangle)).toEqual([])
    expect(clippedLine([5, 5, 15, 5, 15, 8, 5, 8], rectangle)).toEqual([
      [5, 5, 10, 5],
      [10, 8, 5, 8],
    ])
  })
  it('never leaves anything outside, and never moves a line', () => {
    const coordinate = fc.double({ min: -30, max: 30, noNaN: true })
    fc.assert(
      fc.property(fc.array(coordinate, { minLength: 4, maxLength: 12 }), (given) => {
        const line = given.slice(0, given.length - (given.length % 2))
        for (const piece of clippedLine(line, rectangle)) {
          for (let i = 0; i < piece.length; i += 2) {
            const [x, y] = [piece[i]!, piece[i + 1]!]
            expect(Math.min(x, y, 10 - x, 10 - y)).toBeGreaterThan(-1e-9)
            expect(distance(line, x, y)).toBeLessThan(1e-6)
          }
        }
      }),
    )
  })
})

/** Of a point from a line of straight pieces. */
function distance(line: readonly number[], x: number, y: number): number {
  let least = Infinity
  for (let i = 0; i + 3 < line.length; i += 2) {
    const [ax, ay] = [line[i]!, line[i + 1]!]
    const [dx, dy] = [line[i + 2]! - ax, line[i + 3]! - ay]
    const square = dx * dx + dy * dy
    const share = square > 0 ? Math.min(1, Math.max(0, ((x - ax) * dx + (y - ay) * dy) / square)) : 0
    least = Math.min(least, Math.hypot(x - ax - share * dx, y - ay - share * dy))
  }
  return least
}

describe('superfluous points', () => {
  it('go from level ground, its ends stay, and a lump keeps its shape to a twentieth of a pixel', () => {
    expect(withoutStraightPoints([0, 5, 1, 5, 2, 5, 3, 5])).toEqual([0, 5, 3, 5])
    expect(withoutStraightPoints([0, 5, 3, 5])).toEqual([0, 5, 3, 5])
    const ground = Array.from({ length: 400 }, (_, i) => [
      i,
      50 - 8 * Math.exp(-((i - 200) ** 2) / 300),
    ]).flat()
    const fewer = withoutStraightPoints(ground)
    expect(fewer.length).toBeLessThan(0.4 * ground.length)
    for (let i = 0; i < ground.length; i += 2)
      expect(distance(fewer, ground[i]!, ground[i + 1]!)).toBeLessThan(0.051)
    // A step stays a step.
    expect(withoutStraightPoints([0, 5, 1, 5, 1, 2, 2, 2])).toEqual([0, 5, 1, 5, 1, 2, 2, 2])
  })
})
