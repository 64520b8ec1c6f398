// What a running search says without being asked: once, and only when it is so.

import { describe, expect, it } from 'vitest'
import { fixtureTools, mixedPlan } from '../../../tests/fixture.js'
import { Search } from '../../evolution/search.js'
import type { ProgressView } from '../progress-view.js'
import { Alarms } from './alarms.js'
import { nothingFound } from './failures.js'
import { withSilence } from './silence.js'

const search = new Search(fixtureTools(mixedPlan()))
const failing = {
  arrival: () => ({
    result: { values: new Float64Array(3), failures: [{ simulation: 0, reason: 'it fell over.' }] },
  }),
} as never
const view = (changes: Partial<ProgressView> = {}) =>
  ({ state: 'searching', simulations: 40, failedSimulations: 0, setAside: 0, ...changes }) as ProgressView

function alarmsWith(world: { arrivals: number; nowMs: number }) {
  const reader = {
    ...(failing as object),
    totals: () => ({ arrivals: world.arrivals, cpuSeconds: 0 }),
    events: () => [{ kind: 'set-aside', sentence: 'i1-00007 was given up after its last try (died).' }],
  } as never
  return new Alarms(search, reader, () => world.nowMs)
}

describe('a running search says without being asked', () => {
  it('that everything fails and why, once', () => {
    const alarms = alarmsWith({ arrivals: 1, nowMs: 0 })
    expect(alarms.look(view({ simulations: 19, failedSimulations: 19 }))).toEqual([])
    const said = alarms.look(view({ failedSimulations: 40 }))
    expect(said).toHaveLength(1)
    expect(said[0]).toContain('All 40 simulations so far have failed, the first because: it fell over.')
    expect(alarms.look(view({ failedSimulations: 40 }))).toEqual([])
  })
  it('nothing while some simulations succeed', () => {
    expect(alarmsWith({ arrivals: 1, nowMs: 0 }).look(view({ failedSimulations: 39 }))).toEqual([])
  })
  it('that evaluations are set aside: the first, the tenth, the hundredth', () => {
    const alarms = alarmsWith({ arrivals: 1, nowMs: 0 })
    const said = [1, 2, 9, 10, 11, 250].map((setAside) => alarms.look(view({ setAside })).length)
    expect(said).toEqual([1, 0, 0, 1, 0, 1])
    expect(alarmsWith({ arrivals: 1, nowMs: 0 }).look(view({ setAside: 1 }))[0]).toContain(
      '1 evaluation has been set aside as failed, because every try was lost. The last: i1-00007',
    )
  })
  it('that nothing returns any more, once a stretch', () => {
    const world = { arrivals: 5, nowMs: 0 }
    const alarms = alarmsWith(world)
    const lookAt = (seconds: number) => {
      world.nowMs = seconds * 1000
      return alarms.look(view()).length
    }
    expect([lookAt(0), lookAt(59), lookAt(61), lookAt(90)]).toEqual([0, 0, 1, 0])
    world.arrivals = 6
    expect([lookAt(100), lookAt(159), lookAt(161)]).toEqual([0, 0, 1])
  })
})

describe('what a coordinator showed a while ago', () => {
  it('is shown with its age, and promises no end', () => {
    const shown = view({ rate: { simulationsPerSecond: 9, busyFraction: 1, cores: 2, secondsLeft: 60 } })
    expect(withSilence(shown, 3)).toBe(shown)
    expect(withSilence(shown, 75).because).toContain('as of 1 min 15 s ago; nothing was written since')
    expect(withSilence(shown, 75).rate).toBeUndefined()
  })
})

describe('a search in which every machine failed', () => {
  it('says why', () => {
    expect(nothingFound(search, failing).join('\n')).toContain('The first failed because: it fell over.')
  })
})
