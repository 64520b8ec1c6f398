// The islands of a search together, and the one driver that moves them. Islands are deterministic processes that
// read their inputs blockingly (a Kahn process network): whatever order they are driven in, each does the same.
//
// The world comes in through a Gate: which results are there, whether emigrants may leave, what was ordered.
// An in-memory run, the engine, recovery and `rederive` are four gates over this one driver.

import { check } from '../../shared/check.js'
import { chain, emptyChain } from '../../shared/digests.js'
import { firstControl } from '../../shared/ids.js'
import type { EvaluationResult } from '../../shared/result.js'
import { splitBudget } from './budget.js'
import { Island, type IslandTools } from './island.js'
import type { IslandState } from './island-state.js'
import { topologies } from './migration.js'
import type { IslandPlan, SearchPlan } from './plan.js'
import { type Mail, Post } from './post.js'
import type { Ticket } from './tickets.js'
import type { Individual } from './types.js'

export interface Outcome {
  readonly result: EvaluationResult
  readonly digest: Uint8Array
}

/** The world as the driver sees it. Every method is called in the island's own order. */
export interface Gate {
  /** The accepted outcome, or undefined while it is not. */
  outcome(island: Island, ticket: Ticket): Outcome | undefined
  /** For order 'arrival': the evaluation that is committed next, or undefined. */
  nextArrival(island: Island): number | undefined
  /** False where the island shall rest here (--stop-after, or the end of what is recorded). */
  mayCommit(island: Island, ticket: Ticket): boolean
  /** False while an emigrant is not confirmed. */
  maySend(island: Island, epoch: number, emigrants: readonly Individual[]): boolean
  /**
   * Lets the next fact of the world stated for this number of commits enter, while the island waits for its next
   * result (or has ended); true when one did. One at a time, so that a replay does the same.
   */
  factWhileWaiting(island: Island): boolean
  /** Facts stated for the moment before this epoch's emigrants are chosen; may be called again and again. */
  factsBeforeSending(island: Island, epoch: number): void
  /** Facts stated for the end of this epoch; called once after the epoch was passed. */
  factsAtEpoch(island: Island, epoch: number): void
  released(island: Island, tickets: readonly Ticket[]): void
  committed(island: Island, ticket: Ticket, outcome: Outcome): void
  sent(mail: Mail): void
}

/** Why an island stands still. */
export type Standing = 'result' | 'mail' | 'confirmation' | 'resting' | 'paused' | 'ended'

export interface SearchTools {
  readonly plan: SearchPlan
  /** Tools of one island, of the plan or added later; the quota is the search's business. */
  readonly toolsOf: (island: IslandPlan, quota: number) => IslandTools
}

/** From the end of an epoch on: which islands take part, and the plans of those that are new. */
export interface Membership {
  readonly epoch: number
  readonly active: readonly number[]
  readonly added: readonly IslandPlan[]
  /** The budget that is split among all islands from then on. */
  readonly simulations: number
}

export class Search {
  readonly plan: SearchPlan
  readonly #tools: SearchTools
  readonly #states: ReadonlyMap<number, IslandState>
  readonly #plans: IslandPlan[]
  readonly #islands: Island[]
  readonly #byNumber = new Map<number, Island>()
  readonly #post: Post
  /** Who migrates, by the epoch after which it holds; ascending. */
  readonly #memberships: Membership[]
  #simulations: number

  /** `states` are snapshots by island; `recordedMail` finds what was sent before them. */
  constructor(
    tools: SearchTools,
    states: ReadonlyMap<number, IslandState> = new Map(),
    recordedMail: (island: number, epoch: number) => Mail | undefined = () => undefined,
  ) {
    this.plan = tools.plan
    this.#tools = tools
    this.#states = states
    this.#post = new Post(recordedMail)
    this.#plans = [...tools.plan.islands]
    const { simulations } = tools.plan.budget
    this.#simulations = simulations
    this.#memberships = [
      { epoch: 0, active: this.#plans.map(({ island }) => island), added: [], simulations },
    ]
    this.#islands = [...tools.plan.islands, ...tools.plan.controls].map((plan) =>
      this.#make(plan, simulations),
    )
  }

  #make(plan: IslandPlan, simulations: number): Island {
    const quota = this.quotas(simulations).get(plan.island)
    check(quota !== undefined && !this.#byNumber.has(plan.island), 'every island has a quota and a number')
    const island = new Island(this.#tools.toolsOf(plan, quota), this.#states.get(plan.island))
    this.#byNumber.set(plan.island, island)
    return island
  }

  /** In the order of their numbers. */
  get islands(): readonly Island[] {
    return this.#islands
  }

  /** Plans of the islands so far, without controls, paused ones too. */
  get islandPlans(): readonly IslandPlan[] {
    return this.#plans
  }

  /**
   * Quotas by island number for a budget: split by share among the first `islands` of all islands so far, paused
   * ones too; a control has the budget for itself.
   */
  quotas(simulations: number, islands = this.#plans.length): Map<number, number> {
    return quotasOf({ ...this.plan, islands: this.#plans.slice(0, islands) }, simulations)
  }

  /** A budget that was ordered: new islands get their part of it. */
  noteBudget(simulations: number): void {
    this.#simulations = simulations
  }
  get simulations(): number {
    return this.#simulations
  }

  /** The first epoch after which memberships may change: nobody has passed it, and no earlier change holds from it. */
  nextMembershipEpoch(): number {
    return Math.max(this.firstOpenEpoch(), this.#memberships.at(-1)!.epoch + 1)
  }

  /** Who takes part after an epoch that nobody has passed; new islands are there at once and begin with that epoch. */
  changeMembership(membership: Membership): readonly Island[] {
    check(membership.epoch > this.#memberships.at(-1)!.epoch, 'memberships change in the order of epochs')
    this.#memberships.push(membership)
    this.#plans.push(...membership.added)
    return membership.added.map((plan) => {
      const island = this.#make(plan, membership.simulations)
      if (island.counters.evaluations === 0) island.beginAfter(membership.epoch)
      const place = this.#islands.findIndex((other) => other.number > island.number)
      this.#islands.splice(place < 0 ? this.#islands.length : place, 0, island)
      return island
    })
  }

  /** Pauses an island at the end of `epoch`, or only until the epoch after which a later change takes it in again. */
  pause(island: Island, epoch: number): void {
    island.pause()
    const again = this.#memberships.find((one) => one.epoch > epoch && one.active.includes(island.number))
    if (!again) return
    const known = this.#memberships.slice(0, this.#memberships.indexOf(again) + 1)
    const islands = this.plan.islands.length + known.reduce((sum, { added }) => sum + added.length, 0)
    island.setQuota(this.quotas(again.simulations, islands).get(island.number) ?? island.quota)
    island.continueAfter(again.epoch)
  }

  /** Who migrates at the end of this epoch, in the order of their numbers. */
  #migratingAt(epoch: number): readonly number[] {
    if (!this.plan.migration) return []
    return this.#memberships.findLast((membership) => membership.epoch < epoch)?.active ?? []
  }

  /** Commits of an island in the snapshot it was made from; 0 where there was none. */
  commitsRestored(island: number): number {
    return this.#states.get(island)?.counters.commits ?? 0
  }

  island(number: number): Island {
    const island = this.#byNumber.get(number)
    check(island !== undefined, 'islands are asked for by their numbers')
    return island
  }

  get post(): Post {
    return this.#post
  }

  /** Digest of the whole search: the hash of the island digests in the order of their numbers. */
  digest(): Uint8Array {
    return this.islands.reduce((digest, island) => chain(digest, island.digest), emptyChain)
  }

  /** Moves one island as far as it can go. */
  advance(island: Island, gate: Gate): Standing {
    for (;;) {
      const stopped = this.#passEpochs(island, gate)
      if (stopped) return stopped
      const released = island.fill()
      if (released.length > 0) gate.released(island, released)
      if (gate.factWhileWaiting(island)) continue
      // Paused or not: whoever has ended says so, or others would wait for the mail of epochs it never reached.
      if (island.ended) return this.#sendEnd(island, gate)
      if (island.paused) return 'paused'
      const ticket = nextTicket(island, gate)
      // With order 'arrival' nothing more may come in: what would exceed the quota of a rest is not begun.
      if (!ticket)
        return island.outstanding().some((one) => gate.mayCommit(island, one)) ? 'result' : 'resting'
      if (!gate.mayCommit(island, ticket)) return 'resting'
      const outcome = gate.outcome(island, ticket)
      if (!outcome) return 'result'
      island.commit(ticket, outcome.result, outcome.digest)
      gate.committed(island, ticket, outcome)
    }
  }

  /** Moves every island until none can move. Returns where each stands. */
  advanceAll(gate: Gate): Map<number, Standing> {
    const standing = new Map<number, Standing>()
    for (let moved = true; moved; ) {
      moved = false
      for (const island of this.islands) {
        const before = island.counters.commits + island.counters.epochsPassed
        const last = standing.get(island.number)
        standing.set(island.number, this.advance(island, gate))
        const after = island.counters.commits + island.counters.epochsPassed
        if (after !== before || last !== standing.get(island.number)) moved = true
      }
    }
    return standing
  }

  #passEpochs(island: Island, gate: Gate): Standing | undefined {
    for (
      let epoch = island.epochDue();
      epoch !== undefined && !island.ended && !island.paused;
      epoch = island.epochDue()
    ) {
      if (!island.hasReceived) {
        if (!island.isControl && !this.#othersAreNear(epoch)) return 'mail'
        const groups = this.#groupsFor(island, epoch)
        if (!groups) return 'mail'
        island.receive(epoch, groups)
      }
      gate.factsBeforeSending(island, epoch)
      const emigrants = island.emigrants(epoch)
      if (emigrants.length > 0 && !gate.maySend(island, epoch, emigrants)) return 'confirmation'
      island.pass(epoch, emigrants)
      if (this.#migratingAt(epoch).includes(island.number)) {
        this.#send(
          { island: island.number, epoch, atCommit: island.counters.commits, ended: false, emigrants },
          gate,
        )
      }
      gate.factsAtEpoch(island, epoch)
    }
    return undefined
  }

  /**
   * With a target all islands finish with one epoch, so nobody may have passed it when somebody reaches the target.
   * Mail alone would not see to that: whoever is behind an island that has ended waits for nobody.
   */
  #othersAreNear(epoch: number): boolean {
    if (this.plan.budget.target === undefined) return true
    for (let reached = epoch - 1; reached > 0; reached--) {
      const steps = this.#finishSteps(reached)
      if (steps === undefined) return true
      if (reached + steps > epoch) continue
      return this.#migratingAt(reached).every((number) => this.#post.find(number, reached) !== undefined)
    }
    return true
  }

  /** Epochs from the one in which the target is reached to the one all finish with; undefined where each is alone. */
  #finishSteps(epoch: number): number | undefined {
    const { migration } = this.plan
    const steps = migration && topologies[migration.topology].diameter(this.#migratingAt(epoch).length)
    return migration && steps !== undefined ? Math.max(1, steps * migration.lag) : undefined
  }

  #groupsFor(island: Island, epoch: number): (readonly Individual[])[] | undefined {
    const { migration, seed } = this.plan
    if (!migration || epoch <= migration.lag) return []
    const sentEpoch = epoch - migration.lag
    const migrating = this.#migratingAt(sentEpoch)
    const position = migrating.indexOf(island.number)
    if (position < 0) return []
    const groups: (readonly Individual[])[] = []
    const { sources } = topologies[migration.topology]
    for (const source of sources(migrating.length, position, sentEpoch, seed)) {
      const letters = this.#post.find(migrating[source]!, sentEpoch)
      if (!letters) return undefined
      groups.push(letters)
    }
    return groups
  }

  #sendEnd(island: Island, gate: Gate): Standing {
    const epoch = island.counters.epochsPassed + 1
    if (this.#migratingAt(epoch).includes(island.number) && !this.#post.hasEnded(island.number)) {
      this.#send(
        { island: island.number, epoch, atCommit: island.counters.commits, ended: true, emigrants: [] },
        gate,
      )
    }
    return 'ended'
  }

  #send(mail: Mail, gate: Gate): void {
    this.#post.put(mail)
    gate.sent(mail)
  }

  /** Forgets mail that every island has taken in. */
  forgetOldMail(): void {
    const { migration } = this.plan
    if (!migration) return
    const waiting = this.#islands.filter((island) => !island.isControl && !island.ended && !island.paused)
    const oldest = Math.min(
      ...waiting.map(({ counters: { epochsPassed } }) => {
        const steps = this.plan.budget.target === undefined ? 0 : (this.#finishSteps(epochsPassed + 1) ?? 0)
        return epochsPassed + 1 - Math.max(migration.lag, steps)
      }),
    )
    if (Number.isFinite(oldest)) this.#post.forgetBefore(oldest)
  }

  /** The epoch all migrating islands end with when this island reaches the target in its present epoch. */
  finishEpochAfterTarget(island: Island): { readonly island: number; readonly epoch: number } {
    const epoch = island.counters.epochsPassed + 1
    const steps = this.#finishSteps(epoch)
    // Where the way to the others is not known, the island ends for itself.
    return steps === undefined ? { island: island.number, epoch } : { island: 0, epoch: epoch + steps }
  }

  /** The first epoch that no migrating island has passed: when an order from outside takes effect. */
  firstOpenEpoch(): number {
    const passed = this.islands.map((island) => (island.isControl ? 0 : island.counters.epochsPassed))
    return Math.max(0, ...passed) + 1
  }

  /** Sets an ended island going again after `epoch`, if it has quota. */
  resume(island: Island, epoch: number): void {
    const silentFrom = island.counters.epochsPassed + 1
    if (!island.resumeAfter(epoch)) return
    this.#post.resume(island.number, epoch)
    this.#post.silence(island.number, silentFrom, epoch)
  }
}

function nextTicket(island: Island, gate: Gate): Ticket | undefined {
  if (island.tools.island.order !== 'arrival') return island.next()
  const evaluation = gate.nextArrival(island)
  return evaluation === undefined ? undefined : island.ticket(evaluation)
}

/** Quotas by island number: the search's budget split by share; each control has as much for itself. */
export function quotasOf(plan: SearchPlan, simulations: number): Map<number, number> {
  const split = splitBudget(
    simulations,
    plan.islands.map((island) => island.share),
  )
  const quotas = new Map(plan.islands.map((island, position) => [island.island, split[position]!]))
  for (const control of plan.controls) {
    check(control.island >= firstControl, 'controls have numbers of their own')
    quotas.set(control.island, simulations)
  }
  return quotas
}
