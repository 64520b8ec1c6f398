// What the end of a run says beside the numbers.

import { describe, expect, it } from 'vitest'
import { islandPlan, mixedPlan } from '../../../tests/fixture.js'
import { repeatLines } from './finish.js'

describe('a search that its file alone cannot repeat', () => {
  it('says so: results taken as they arrive, or a problem that promises less than bits', () => {
    const arrival = mixedPlan({ islands: [islandPlan(1), islandPlan(2, { order: 'arrival' })] })
    expect(repeatLines(arrival, 'bits').join()).toContain('order of arrival')
    expect(repeatLines(mixedPlan(), 'statistical').join()).toContain('by chance')
    expect(repeatLines(mixedPlan(), 'bits')).toEqual([])
  })
})
