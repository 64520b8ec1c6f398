// Fixed steps up to a time or an event. An event is a sign change of a function of time and state across a step;
// its instant is then found to round-off by repeating that step with shorter lengths, so that the state at the
// event has the method's own accuracy and no interpolation error is added.
//
// What fixed steps cannot see: two sign changes within one step cancel. Choose the step for the event as well.

import { check } from '../../shared/check.js'
import type { Method, Rates, Step } from './runge-kutta.js'

export interface EventOf {
  /** Continuous in time and state; the event is where it passes zero. */
  readonly value: (seconds: number, state: Float64Array) => number
  /** 1: only while the value grows, -1: only while it falls, 0: both. */
  readonly direction: 1 | 0 | -1
  /** Says of a passage, found to round-off, whether it is one of those looked for; all are when absent. */
  readonly counts?: (seconds: number, state: Float64Array) => boolean
}

export interface Happening {
  /** Place in the list of events. */
  readonly event: number
  readonly seconds: number
}

/** Equations, state and time, moved on by `flow`. */
export interface Motion {
  readonly step: Step
  readonly state: Float64Array
  readonly stepSeconds: number
  seconds: number
  readonly spare: Float64Array
}

/** A motion that starts at time 0 from a copy of `start`. */
export function startMotion(
  method: Method,
  rates: Rates,
  start: ArrayLike<number>,
  stepSeconds: number,
): Motion {
  check(stepSeconds > 0, 'a step takes time')
  const state = Float64Array.from(start)
  const spare = new Float64Array(state.length)
  return { step: method(rates, state.length), state, stepSeconds, seconds: 0, spare }
}

/**
 * Moves on until the first event that counts or until `untilSeconds`, whichever is sooner; what happened, or
 * nothing. State and time are then those of the event. An event at the very start is not counted: a motion that
 * is stopped by an event goes on by calling again (after a jump of its state, say). A state that is no number
 * stops it too, with event -1.
 */
export function flow(
  motion: Motion,
  untilSeconds: number,
  events: readonly EventOf[],
): Happening | undefined {
  const { state, spare, step } = motion
  const before = events.map((event) => event.value(motion.seconds, state))
  while (motion.seconds < untilSeconds) {
    const length = Math.min(motion.stepSeconds, untilSeconds - motion.seconds)
    step(motion.seconds, length, state, spare)
    const after = motion.seconds + length
    if (!spare.every(Number.isFinite)) return { event: -1, seconds: motion.seconds }
    const happening = earliest(motion, length, events, before)
    if (happening) return happening
    for (let i = 0; i < events.length; i++) before[i] = events[i]!.value(after, spare)
    state.set(spare)
    // The rest of the way is done in one go: no second, tiny step where sums round.
    motion.seconds = length < motion.stepSeconds ? untilSeconds : after
  }
  return undefined
}

/** The earliest counting event within the step that led to `spare`; moves the motion there. */
function earliest(
  motion: Motion,
  length: number,
  events: readonly EventOf[],
  before: readonly number[],
): Happening | undefined {
  const { state, spare, step } = motion
  let first: { event: number; length: number } | undefined
  const end = Float64Array.from(spare)
  for (let i = 0; i < events.length; i++) {
    const event = events[i]!
    const after = event.value(motion.seconds + length, end)
    if (!passes(event.direction, before[i]!, after)) continue
    const at = locate(motion, length, event, before[i]!, after)
    step(motion.seconds, at, state, spare)
    if (first && first.length <= at) continue
    if (event.counts === undefined || event.counts(motion.seconds + at, spare))
      first = { event: i, length: at }
  }
  if (!first) {
    spare.set(end)
    return undefined
  }
  step(motion.seconds, first.length, state, spare)
  state.set(spare)
  motion.seconds += first.length
  return { event: first.event, seconds: motion.seconds }
}

/** From one side to the other or onto zero; starting on zero is no passage. */
function passes(direction: 1 | 0 | -1, before: number, after: number): boolean {
  if (direction >= 0 && before < 0 && after >= 0) return true
  return direction <= 0 && before > 0 && after <= 0
}

/** Most looks at one event; every third at least halves, and 50 halvings exhaust a double. */
const looksMost = 160
/** An event is found within this part of the step. */
const roundOff = 1 / 2 ** 50

/**
 * How long the step must be for the event's value to be zero or just past it, to round-off: regula falsi in the
 * Illinois form (Dowell and Jarratt, A modified regula falsi method for computing the root of an equation, 1971;
 * from memory), with a halving wherever three looks did not halve the bracket.
 */
function locate(
  { seconds, state, step, spare }: Motion,
  length: number,
  event: EventOf,
  atStart: number,
  atEnd: number,
): number {
  const least = roundOff * length
  let low = 0
  let high = length
  let lowValue = atStart
  let highValue = atEnd
  let kept = 0
  let width = length
  for (let look = 1; look <= looksMost && highValue !== 0 && high - low > 2 * least; look++) {
    let part = high - (highValue * (high - low)) / (highValue - lowValue)
    if (look % 3 === 0) {
      if (high - low > 0.5 * width) part = low + 0.5 * (high - low)
      width = high - low
    }
    part = Math.min(high - least, Math.max(low + least, part))
    step(seconds, part, state, spare)
    const value = event.value(seconds + part, spare)
    if (value !== 0 && value > 0 === atStart > 0) {
      low = part
      lowValue = value
      if (kept === 1) highValue *= 0.5
      kept = 1
    } else {
      high = part
      highValue = value
      if (kept === -1) lowValue *= 0.5
      kept = -1
    }
  }
  return high
}
