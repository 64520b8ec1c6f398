// One island: a deterministic machine that proposes evaluations and commits their results in a known order.
//
//   commit -> the epoch's work (receive, then send) -> proposals the commit released -> next commit
//
// That interleaving is part of the search's definition; drive.ts runs it. Nothing here knows of workers, time
// or arrival. Every change enters the island's digest, a running hash: equal digests, equal histories.

import { check } from '../../shared/check.js'
import { genomeBytes } from '../../shared/encodings.js'
import type { Genome } from '../../shared/genome.js'
import { firstControl, idOf } from '../../shared/ids.js'
import type { EvaluationResult } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { amendmentEntry, commitEntry, receiveEntry, sendEntry } from './entries.js'
import { EpochClock } from './epoch-clock.js'
import { columnsOf } from './estimate.js'
import { addBlock, amended, joined, newborn } from './individuals.js'
import { type Amendment, type Counters, type IslandState, newCounters, Positions } from './island-state.js'
import { Leader, wouldBeat } from './leader.js'
import { chooseEmigrants } from './migration.js'
import type { IslandPlan, SearchPlan } from './plan.js'
import { RunningDigest } from './running-digest.js'
import { TicketOffice } from './ticket-office.js'
import { Outstanding, type Ticket } from './tickets.js'
import type { Individual, Method, MethodContext, MethodMachine, Variation } from './types.js'

/** What an island is made with: the plan and functions of the problem and the method. */
export interface IslandTools {
  readonly plan: SearchPlan
  readonly island: IslandPlan
  /** Simulations this island may spend. */
  readonly quota: number
  readonly method: Method
  readonly variation: Variation
  readonly expectedCost: (genome: Genome) => number
}

export class Island {
  readonly tools: IslandTools
  readonly number: number
  readonly #machine: MethodMachine
  readonly #counters: Counters
  readonly #clock: EpochClock
  readonly #office: TicketOffice
  readonly #outstanding: Outstanding
  readonly #amendments: Amendment[]
  #topUpQueue: Individual[]
  readonly #digest: RunningDigest
  /** Digest right after the last commit; undefined while nothing but that commit followed. */
  #commitDigest: Uint8Array | undefined
  #quota: number
  #mostReplicates: number
  #ended: boolean
  #paused: boolean
  /** Set going again: what was outstanding when it ended is to be handed out once more. */
  #handsOutAgain = false
  readonly #leader: Leader

  constructor(tools: IslandTools, state?: IslandState) {
    this.tools = tools
    this.number = tools.island.island
    const byPosition = (position: number): Individual => {
      const individual = state?.individuals[position]
      check(individual !== undefined, 'a snapshot refers to its own individuals')
      return individual
    }
    this.#counters = state ? { ...state.counters } : newCounters()
    this.#office = new TicketOffice(tools, this.#counters)
    this.#clock = new EpochClock(this.#counters, tools.plan.migration?.everyRounds, tools.island.lookahead)
    this.#digest = new RunningDigest(state?.digest)
    this.#quota = state?.quota ?? tools.quota
    this.#mostReplicates = state?.mostReplicates ?? tools.plan.replicates.most
    this.#ended = state?.ended ?? false
    this.#paused = state?.paused ?? false
    this.#outstanding = new Outstanding(
      state?.tickets.map((ticket) => ({ ...ticket, individual: byPosition(ticket.individual) })),
    )
    this.#topUpQueue = state?.topUpQueue.map(byPosition) ?? []
    this.#amendments = [...(state?.amendments ?? [])]
    const best = state && state.best >= 0 ? byPosition(state.best) : undefined
    this.#leader = new Leader(tools.plan.problem.objectives.length, best, state?.bestScores)
    const held = new Map(state?.held.map((position) => [byPosition(position).id, byPosition(position)]))
    this.#machine = state
      ? tools.method.restore(contextOf(tools), state.machine, (id) => {
          const individual = held.get(id)
          check(individual !== undefined, 'a saved method refers to individuals it held')
          return individual
        })
      : tools.method.create(contextOf(tools))
  }

  // ------------------------------------------------------------------------------------ what it is

  /** Running hash of everything this island has committed, received, sent and amended. */
  get digest(): Uint8Array {
    return this.#digest.digest
  }
  /** The same as it was right after the last commit. */
  get commitDigest(): Uint8Array {
    return this.#commitDigest ?? this.#digest.digest
  }
  #note(entry: Uint8Array): void {
    this.#commitDigest ??= this.#digest.digest
    this.#digest.add(entry)
  }
  get counters(): Readonly<Counters> {
    return this.#counters
  }
  /** True once the quota is used or a finish was ordered, and the word of it may be sent. */
  get ended(): boolean {
    return this.#ended
  }
  /** True while an order from outside keeps it from proposing and committing. */
  get paused(): boolean {
    return this.#paused
  }
  get quota(): number {
    return this.#quota
  }
  get best(): Individual | undefined {
    return this.#leader.best
  }
  get isControl(): boolean {
    return this.number >= firstControl
  }
  /** Island time: rounds committed. */
  get rounds(): number {
    return this.#counters.costCommitted / this.tools.island.lookahead
  }
  /** Replicates the best may get. */
  get mostReplicates(): number {
    return this.#mostReplicates
  }
  /** Everybody alive: members, those committed but not yet members, and the best. */
  living(): ReadonlySet<Individual> {
    return new Set([...this.#machine.held(), ...(this.#leader.best ? [this.#leader.best] : [])])
  }
  members(): readonly Individual[] {
    return this.#machine.members()
  }
  ranked(): readonly Individual[] {
    return this.#machine.ranked()
  }
  /** None once the island has ended: what it had proposed waits until it is set going again. */
  outstanding(): readonly Ticket[] {
    return this.#ended ? [] : this.#outstanding.all()
  }
  ticket(evaluation: number): Ticket | undefined {
    return this.#outstanding.find(evaluation)
  }

  // ----------------------------------------------------------------------------------- proposing

  /** Proposes while there are free slots, quota and a willing method. Returns what is new, in order. */
  fill(): Ticket[] {
    const released = this.#handsOutAgain ? [...this.#outstanding.all()] : []
    this.#handsOutAgain = false
    while (!this.#ended && !this.#paused && this.#outstanding.size < this.tools.island.lookahead) {
      const ticket = this.#proposeTopUp() ?? this.#proposeBirth()
      if (!ticket) break
      this.#outstanding.add(ticket)
      released.push(ticket)
    }
    if (this.#outstanding.size === 0 && !this.#ended && !this.#paused) {
      check(!this.#affords(this.tools.plan.replicates.first), 'a method waits only for results')
      this.#ended = true
    }
    return released
  }

  #proposeTopUp(): Ticket | undefined {
    const individual = this.#topUpQueue[0]
    if (!individual) return undefined
    const { topUp } = this.tools.plan.replicates
    const replicates = Math.min(topUp, this.#mostReplicates - individual.replicates)
    if (replicates <= 0 || !this.#affords(replicates)) {
      this.#topUpQueue.shift()
      return undefined
    }
    this.#topUpQueue.shift()
    this.#counters.topUps++
    return this.#office.issue(individual, replicates, false)
  }

  #proposeBirth(): Ticket | undefined {
    const { first } = this.tools.plan.replicates
    if (!this.#affords(first)) return undefined
    const number = this.#counters.births + 1
    const birth = this.#machine.propose(stream(this.tools.plan.seed, 'birth', this.number, number))
    if (birth === 'wait') return undefined
    this.#counters.births = number
    const id = idOf(this.number, number)
    const individual = newborn(id, birth, this.#counters.commits, this.#leader.noScore)
    // Fresh individuals that come later are no founders: nobody waits for them.
    const founder = birth.origin === 'founder' && number <= this.tools.island.population
    return this.#office.issue(individual, first, founder)
  }

  #affords(replicates: number): boolean {
    return this.#office.affords(replicates, this.#quota)
  }

  // ---------------------------------------------------------------------------------- committing

  /** The ticket that is committed next, or undefined when none is outstanding (or the order is 'arrival'). */
  next(): Ticket | undefined {
    if (this.tools.island.order === 'cost') return this.#outstanding.firstToFinish()
    return this.tools.island.order === 'proposal' ? this.#outstanding.oldest() : undefined
  }

  /** Changes whenever best scores may have risen; between changes they only fall. */
  get bestScoresVersion(): number {
    return this.#leader.recounts
  }

  /** True when this result would make a new best value of some objective on this island. */
  wouldBeBest(ticket: Ticket, result: EvaluationResult): boolean {
    const { individual } = ticket
    const failed = individual.failedSimulations + result.failures.length
    if (failed > 0) return false
    const values = joined(individual.values, result.values)
    return wouldBeat(this.tools.plan.problem, values, this.#leader.bestScores)
  }

  /** Takes a result in. `resultDigest` is 32 bytes over the result's canonical bytes. */
  commit(ticket: Ticket, result: EvaluationResult, resultDigest: Uint8Array): void {
    const { plan } = this.tools
    check(!this.#ended && !this.#paused, 'an island that has ended or is paused commits nothing')
    check(
      result.values.length === ticket.simulations * columnsOf(plan.problem),
      'a result has a row for every simulation',
    )
    this.#outstanding.remove(ticket)
    const { individual } = ticket
    const firstBlock = individual.replicates === 0
    addBlock(plan.problem, individual, result, {
      island: this.number,
      evaluation: ticket.evaluation,
      firstReplicate: ticket.firstReplicate,
      replicates: ticket.replicates,
      failedSimulations: result.failures.length,
    })
    const counters = this.#counters
    counters.commits++
    counters.factsWaiting = 0
    counters.committedSimulations += ticket.simulations
    counters.costCommitted += ticket.expectedCost
    counters.virtualTime = Math.max(counters.virtualTime, ticket.virtualFinish)
    counters.failedSimulations += result.failures.length
    if (firstBlock)
      this.#machine.commit(individual, stream(plan.seed, 'commit', this.number, counters.commits))
    else this.#machine.reconsider(individual)
    this.#noteBest(individual)
    this.#queueTopUp()
    this.#digest.add(commitEntry(counters.commits, ticket, resultDigest))
    this.#commitDigest = undefined
  }

  #noteBest(individual: Individual): void {
    if (this.#leader.note(individual, this.#machine))
      this.#counters.bestSinceCost = this.#counters.costCommitted
  }

  /** Top-ups go to the island's best until it has the most replicates: the estimate that is shown and bred from. */
  #queueTopUp(): void {
    const { best } = this.#leader
    if (!best || this.tools.plan.replicates.topUp === 0) return
    if (best.replicates >= this.#mostReplicates || best.failedSimulations > 0) return
    const asked =
      this.#topUpQueue.includes(best) || this.#outstanding.all().some((ticket) => ticket.individual === best)
    if (!asked) this.#topUpQueue.push(best)
  }

  // -------------------------------------------------------------------------------------- epochs

  /** The epoch that has ended and whose work is not done, or undefined. */
  epochDue(): number | undefined {
    return this.#clock.due()
  }

  get hasReceived(): boolean {
    return this.#clock.hasReceived
  }

  /** Takes in the emigrants that are due at the end of `epoch`, group by group in the order of sources. */
  receive(epoch: number, groups: readonly (readonly Individual[])[]): void {
    check(
      epoch === this.#counters.epochsPassed + 1 && !this.hasReceived,
      'epochs are received once, in order',
    )
    this.#counters.epochsReceived = epoch
    const arrivals = groups.flat().map((individual) => this.#amended({ ...individual }))
    const placement = this.tools.plan.migration?.arrive
    if (arrivals.length === 0 || placement === undefined) return
    this.#machine.immigrate(arrivals, placement, stream(this.tools.plan.seed, 'arrivals', this.number, epoch))
    for (const individual of arrivals) this.#noteBest(individual)
    this.#queueTopUp()
    this.#note(receiveEntry(epoch, arrivals))
  }

  /** Who would leave at the end of `epoch`: as they are now, best first or drawn. */
  emigrants(epoch: number): Individual[] {
    const { migration, seed } = this.tools.plan
    if (!migration || this.isControl) return []
    return chooseEmigrants(migration, this.#machine.ranked(), stream(seed, 'emigrants', this.number, epoch))
  }

  /** Ends the epoch after its emigrants are on their way. */
  pass(epoch: number, sent: readonly Individual[]): void {
    check(
      this.hasReceived && epoch === this.#counters.epochsReceived,
      'an epoch is passed after it was received',
    )
    this.#counters.epochsPassed = epoch
    this.#counters.factsSending = 0
    if (sent.length > 0) this.#note(sendEntry(epoch, sent))
    const { stagnationRounds } = this.tools.plan.budget
    const stale = this.#counters.costCommitted - this.#counters.bestSinceCost
    const stagnant =
      stagnationRounds !== undefined &&
      !this.isControl &&
      stale >= stagnationRounds * this.tools.island.lookahead
    if (stagnant) this.end()
  }

  /** Commits nothing more. What is outstanding is kept: a method may wait for it when the island goes on one day. */
  end(): void {
    this.#ended = true
  }

  // ------------------------------------------------------------------------ facts of the world

  /** A new quota from now on. */
  setQuota(quota: number): void {
    this.#quota = quota
  }

  /** One more fact of the world has entered at this stage: a snapshot knows which a replay must not let in again. */
  noteFact(stage: 'waiting' | 'sending'): void {
    if (stage === 'waiting') this.#counters.factsWaiting++
    else this.#counters.factsSending++
  }

  /** Sets an ended island going again, as if it had just passed `epoch`. False when its quota is still used up. */
  resumeAfter(epoch: number): boolean {
    check(this.#ended, 'only an ended island is set going again')
    if (!this.#affords(this.tools.plan.replicates.first)) return false
    this.#clock.joinAfter(epoch)
    this.#ended = false
    this.#handsOutAgain = true
    return true
  }

  /** An island that was added while others search: its first epoch is the one after `epoch`. */
  beginAfter(epoch: number): void {
    check(this.#counters.evaluations === 0, 'an island begins once')
    this.#clock.joinAfter(epoch)
  }

  /** Stands still from now on; what is outstanding stays so. */
  pause(): void {
    this.#paused = true
  }

  /** Goes on, as if it had just passed `epoch`. */
  continueAfter(epoch: number): void {
    check(this.#paused, 'only a paused island is continued')
    this.#paused = false
    this.#clock.joinAfter(epoch)
  }

  setMostReplicates(most: number): void {
    this.#mostReplicates = most
  }

  /** Puts a wrong result right in everybody alive here, and in everybody who arrives later. */
  amend(amendment: Amendment): void {
    this.#amendments.push(amendment)
    const touched = new Set([...this.living(), ...this.#topUpQueue])
    for (const ticket of this.#outstanding.all()) touched.add(ticket.individual)
    for (const individual of touched) {
      if (individual.id !== amendment.individual) continue
      Object.assign(individual, this.#amended({ ...individual }))
      this.#machine.reconsider(individual)
    }
    // A false best must not stand in the way of true ones.
    this.#leader.recount(this.#machine)
    this.#note(amendmentEntry(this.#counters.commits, amendment))
  }

  #amended(individual: Individual): Individual {
    return this.#amendments.reduce(
      (one, amendment) => amended(this.tools.plan.problem, one, amendment),
      individual,
    )
  }

  // ------------------------------------------------------------------------------------ snapshots

  /** Everything needed to go on from here, structured-cloneable. Shares memory with the island. */
  save(): IslandState {
    const positions = new Positions()
    const positionOf = (individual: Individual) => positions.of(individual)
    const { best, bestScores } = this.#leader
    return {
      counters: { ...this.#counters },
      digest: this.#digest.save(),
      quota: this.#quota,
      mostReplicates: this.#mostReplicates,
      ended: this.#ended,
      paused: this.#paused,
      held: this.#machine.held().map(positionOf),
      best: best ? positionOf(best) : -1,
      topUpQueue: this.#topUpQueue.map(positionOf),
      tickets: this.#outstanding
        .all()
        .map((ticket) => ({ ...ticket, individual: positionOf(ticket.individual) })),
      amendments: this.#amendments,
      bestScores: bestScores.slice(),
      machine: this.#machine.save(),
      individuals: positions.individuals,
    }
  }

  /** Canonical bytes of a genome of this search. */
  bytesOf(genome: Genome): Uint8Array {
    return genomeBytes(this.tools.plan.problem.spec, genome)
  }
}

function contextOf(tools: IslandTools): MethodContext {
  return {
    spec: tools.plan.problem.spec,
    objectives: tools.plan.problem.objectives.length,
    population: tools.island.population,
    settings: tools.island.settings,
    variation: tools.variation,
  }
}
