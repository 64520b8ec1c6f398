// In which of its states an agent is. Conditions change one by one; the state follows from all of them, the gravest
// first. What each state means to a person stands in shared/cluster/messages.ts.
//
//   starting ──opened──▶ idle ◀──▶ working        leaving is the end of every path
//                          └──┬──────┘
//             cut-off ◀──────▶│◀──────▶ draining

import { check } from '../../shared/check.js'
import type { AgentState } from '../../shared/cluster/messages.js'

export interface Conditions {
  /** Redis has answered once. */
  readonly opened: boolean
  readonly connected: boolean
  /** Simulations run. */
  readonly busy: boolean
  /** Takes no more, but was not asked to end. */
  readonly draining: boolean
  readonly leaving: boolean
}

const atFirst: Conditions = { opened: false, connected: false, busy: false, draining: false, leaving: false }

export function stateOf({ opened, connected, busy, draining, leaving }: Conditions): AgentState {
  if (leaving) return 'leaving'
  if (!opened) return 'starting'
  if (!connected) return 'cut-off'
  if (draining) return 'draining'
  return busy ? 'working' : 'idle'
}

export class AgentCondition {
  private readonly nowMs: () => number
  private readonly changed: (state: AgentState, before: AgentState) => void
  private conditions = atFirst
  private sinceMs: number
  state: AgentState = 'starting'

  constructor(nowMs: () => number, changed: (state: AgentState, before: AgentState) => void) {
    this.nowMs = nowMs
    this.changed = changed
    this.sinceMs = nowMs()
  }

  /** Seconds in the present state. */
  get seconds(): number {
    return (this.nowMs() - this.sinceMs) / 1000
  }

  note(news: Partial<Conditions>): void {
    const { opened, leaving } = this.conditions
    check(!opened || news.opened !== false, 'an agent starts once')
    check(!leaving || news.leaving !== false, 'an agent that leaves does not come back')
    this.conditions = { ...this.conditions, ...news }
    const state = stateOf(this.conditions)
    if (state === this.state) return
    const before = this.state
    this.state = state
    this.sinceMs = this.nowMs()
    this.changed(state, before)
  }
}
