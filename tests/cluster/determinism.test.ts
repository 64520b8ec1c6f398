// Promise: a search is a pure function of its plan. Here without any engine: islands driven in different orders,
// results withheld in different ways, stopped and continued, saved and restored.

import { describe, expect, it } from 'vitest'
import type { Island } from '../../coordinator/evolution/island.js'
import type { SearchPlan } from '../../coordinator/evolution/plan.js'
import { type Gate, quotasOf, Search } from '../../coordinator/evolution/search.js'
import type { Ticket } from '../../coordinator/evolution/tickets.js'
import { hex, resultDigest } from '../../shared/digests.js'
import { stream } from '../../shared/streams.js'
import { fixtureTools, mixedPlan, simulated } from '../fixture.js'

/** All results are there at once, unless `withhold` says that this one is late by one more look. */
function openGate(plan: SearchPlan, withhold: () => boolean, stopAfter?: number): Gate {
  const stops = stopAfter === undefined ? undefined : quotasOf(plan, stopAfter)
  return {
    outcome: (_island: Island, ticket: Ticket) => {
      if (withhold()) return undefined
      const result = simulated(plan, ticket.individual.genome, ticket.firstReplicate, ticket.replicates)
      return { result, digest: resultDigest(result) }
    },
    nextArrival: (island) => island.outstanding()[0]?.evaluation,
    mayCommit: (island, ticket) =>
      stops === undefined ||
      island.counters.committedSimulations + ticket.simulations <= stops.get(island.number)!,
    maySend: () => !withhold(),
    factWhileWaiting: () => false,
    factsBeforeSending: () => {},
    factsAtEpoch: () => {},
    released: () => {},
    committed: () => {},
    sent: () => {},
  }
}

function finish(search: Search, gate: Gate): string {
  for (let look = 0; look < 100_000; look++) {
    const standing = [...search.advanceAll(gate).values()]
    if (standing.every((one) => one === 'ended')) break
    if (standing.every((one) => one === 'ended' || one === 'resting' || one === 'mail')) break
  }
  return hex(search.digest())
}

const plan = mixedPlan()
const reference = finish(
  new Search(fixtureTools(plan)),
  openGate(plan, () => false),
)

describe('a search is a pure function of its plan', () => {
  it('commits the whole budget of every island', () => {
    const search = new Search(fixtureTools(plan))
    finish(
      search,
      openGate(plan, () => false),
    )
    for (const island of search.islands) {
      expect(island.ended).toBe(true)
      expect(island.counters.committedSimulations).toBeGreaterThan(island.quota - plan.replicates.first - 2)
      expect(island.counters.committedSimulations).toBeLessThanOrEqual(island.quota)
    }
    expect(search.island(1).counters.epochsPassed).toBeGreaterThan(2)
    expect(search.island(1).counters.topUps).toBeGreaterThan(0)
  })

  it('has one digest whatever is withheld', () => {
    for (let seed = 1; seed <= 12; seed++) {
      const draw = stream(seed, 'weather')
      const gate = openGate(plan, () => draw.chance(seed, 14))
      expect(finish(new Search(fixtureTools(plan)), gate), `seed ${seed}`).toBe(reference)
    }
  })

  it('another seed, another digest', () => {
    const other = mixedPlan({ seed: 1 })
    expect(
      finish(
        new Search(fixtureTools(other)),
        openGate(other, () => false),
      ),
    ).not.toBe(reference)
  })

  it('stopping at n, 2n, 3n equals 3n at once, and the whole budget equals the reference', () => {
    const steps = new Search(fixtureTools(plan))
    const atOnce = new Search(fixtureTools(plan))
    for (const stop of [120, 240, 360])
      finish(
        steps,
        openGate(plan, () => false, stop),
      )
    expect(hex(steps.digest())).toBe(
      finish(
        atOnce,
        openGate(plan, () => false, 360),
      ),
    )
    expect(
      finish(
        steps,
        openGate(plan, () => false),
      ),
    ).toBe(reference)
  })

  it('goes on from snapshots taken anywhere', () => {
    const draw = stream(5, 'weather')
    let search = new Search(fixtureTools(plan))
    const mail = new Map<string, Parameters<Gate['sent']>[0]>()
    const gate = { ...openGate(plan, () => draw.chance(1, 3)) }
    gate.sent = (letter) => void mail.set(`${letter.island} ${letter.epoch}`, letter)
    for (let round = 0; round < 2_000; round++) {
      for (const island of search.islands) search.advance(island, gate)
      const states = new Map(search.islands.map((island) => [island.number, structuredClone(island.save())]))
      const next = new Search(fixtureTools(plan), states, (island, epoch) => mail.get(`${island} ${epoch}`))
      for (const letter of mail.values()) if (letter.ended) next.post.put(letter)
      search = next
      if (search.islands.every((island) => island.ended)) break
    }
    expect(hex(search.digest())).toBe(reference)
  })
})
