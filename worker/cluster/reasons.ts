// Reasons of an agent's own to end: the time of its machine is over, nobody needs it, nothing that is announced can be
// served here, or it is ill.

import { exitCodes } from '../../shared/refusals.js'
import type { Agent, Ending } from './agent.js'
import type { SearchLane } from './lane.js'
import { Watchdog } from './watchdog.js'

export class Reasons {
  private readonly agent: Agent
  private readonly watchdog: Watchdog
  private idleSinceMs: number

  constructor(agent: Agent) {
    this.agent = agent
    this.watchdog = new Watchdog(agent.options.times.idleWithWorkMs)
    this.idleSinceMs = agent.options.nowMs()
  }

  /** A job was taken. */
  took(): void {
    this.watchdog.took()
  }

  /** Called often. */
  look(): Ending | undefined {
    return this.timeOver() ?? this.notNeeded() ?? this.hopeless() ?? this.ill()
  }

  /** Whether what takes so long ends before this machine is taken away; nobody counts where nobody says when. */
  isInTime(seconds: () => number | undefined): boolean {
    const { untilMs, nowMs, times } = this.agent.options
    return untilMs === undefined || nowMs() + (seconds() ?? 0) * 1000 < untilMs - times.handBackMs
  }

  /** No search has evaluations that would end in time. */
  get isTooLate(): boolean {
    const lanes = this.agent.services.lanes()
    return lanes.length > 0 && lanes.every((lane) => !this.isInTime(() => lane.durations.p95Seconds()))
  }

  private timeOver(): Ending | undefined {
    const { untilMs } = this.agent.options
    if (untilMs === undefined) return undefined
    if (!this.isInTime(() => 0)) return { sentence: 'The time of this machine is over.' }
    if (!this.isTooLate || this.agent.hands.jobs().length > 0) return undefined
    return { sentence: 'No evaluation would end before the time of this machine is over.' }
  }

  private notNeeded(): Ending | undefined {
    const { nowMs, idleExitMs } = this.agent.options
    if (this.agent.hands.jobs().length > 0) this.idleSinceMs = nowMs()
    if (idleExitMs === undefined || nowMs() - this.idleSinceMs < idleExitMs) return undefined
    const sentence = `Nothing to do for ${idleExitMs / 1000} s`
    if (this.agent.server.connected) return { sentence: `${sentence}.`, exitCode: exitCodes.done }
    return { sentence: `${sentence}, and Redis cannot be reached.`, exitCode: exitCodes.unreachable }
  }

  private hopeless(): Ending | undefined {
    return this.agent.services.hopeless(this.agent.options.times.announcementMs)
  }

  private ill(): Ending | undefined {
    const { nowMs, times } = this.agent.options
    if (!this.watchdog.look(nowMs(), this.couldTake())) return undefined
    const sentence = `Work has been waiting for ${times.idleWithWorkMs / 1000} s, cores are free, and this worker got none. It ends, so that a fresh one takes its place.`
    return { sentence, exitCode: exitCodes.unreachable }
  }

  /** Nothing that we know of keeps us from taking what is announced as waiting. */
  private couldTake(): boolean {
    const { condition, services } = this.agent
    if (condition.state !== 'idle' && condition.state !== 'working') return false
    return services.lanes().some((lane) => this.couldTakeOf(lane))
  }

  private couldTakeOf(lane: SearchLane): boolean {
    const { services, room } = this.agent
    const { needs } = lane.options.announcement
    const hasLicences = Object.keys(needs.tokens).length > 0
    return (
      services.of(lane)?.announcement.waiting === true &&
      lane.stashed === 0 &&
      lane.state !== 'opening' &&
      !hasLicences &&
      this.agent.mayTake(lane) &&
      room.fits(needs)
    )
  }
}
