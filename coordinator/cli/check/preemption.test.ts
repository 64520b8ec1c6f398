import { expect, test } from 'vitest'
import { destroyedShare, preemptionLine, restartFactor } from './preemption.js'

// Source: E = (e^(lambda T) - 1) / lambda, evaluated with 30 digits; the formula is Duda's of 1983 (from memory).
test.each([
  [0.1, 1.0517091808],
  [0.5, 1.2974425414],
  [1, 1.7182818285],
  [2, 3.1945280495],
  [3, 6.3618456411],
  [5, 29.4826318205],
])('work of %s lives takes %s times its own time', (cuts, factor) => {
  expect(restartFactor(cuts * 300, 300) / factor).toBeCloseTo(1, 9)
  expect(destroyedShare(cuts * 300, 300)).toBeCloseTo(1 - 1 / factor, 9)
})

test('short evaluations and problems that save their state get no line, long ones the shares', () => {
  expect(preemptionLine(0, false)).toBeUndefined()
  expect(preemptionLine(2, false)).toBeUndefined()
  expect(preemptionLine(7200, true)).toBeUndefined()
  const line = preemptionLine(300, false)
  expect(line).toContain('41 % where workers live 5 min 0 s')
  expect(line).toContain('4.1 % where workers live 1 h 0 min')
})
