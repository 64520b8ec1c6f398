// Numbers that pictures need beside the drawing: moments, round steps, lengths as people write them.

import { check } from '../check.js'
import type { Frames } from '../frames.js'

/** Evenly spaced frames, first and last among them. */
export function momentsOf(frames: Frames, count: number): number[] {
  const last = frames.positions.length - 1
  const wanted = Math.min(count, last + 1)
  const moments = Array.from({ length: wanted }, (_, i) =>
    wanted === 1 ? 0 : Math.round((i * last) / (wanted - 1)),
  )
  return [...new Set(moments)]
}

export function secondsAt(frames: Frames, frame: number): number {
  return frame * frames.secondsPerFrame
}

/** A time with the decimals that tell one step of `stepSeconds` from the next, at least `least`. */
export function timeText(seconds: number, stepSeconds: number, least: number): string {
  let decimals = least
  for (let finest = least === 1 ? 0.095 : 0.0095; decimals < 6 && stepSeconds < finest; finest /= 10)
    decimals++
  return `${seconds.toFixed(decimals)} s`
}

/** The power of ten at or below a positive number, without logarithms: their last bit depends on the machine. */
function powerBelow(value: number): number {
  check(value > 0 && Number.isFinite(value), 'a step has a size')
  return Number(`1e${value.toExponential().split('e')[1]}`)
}

/** A round number (1, 2 or 5 times a power of ten) at most `most`, for ticks and scale bars. */
export function roundStep(most: number): number {
  const power = powerBelow(most)
  return times([5, 2, 1].find((factor) => factor * power <= most * (1 + 1e-9)) ?? 1, power)
}

/** A round number at least `least`: ticks no nearer than that, so that their numbers do not touch. */
export function roundStepUp(least: number): number {
  const power = powerBelow(least)
  return times([1, 2, 5].find((factor) => factor * power >= least * (1 - 1e-9)) ?? 10, power)
}

/** 5 x 0.01 is written 0.05, not 0.05000000000000001. */
function times(factor: number, power: number): number {
  return Number((factor * power).toPrecision(3))
}

/** A length as a person writes it: 20 mm, 0.5 m. */
export function lengthText(metres: number): string {
  const size = Math.abs(metres)
  if (size < 0.001) return `${Number((metres * 1e6).toPrecision(3))} µm`
  if (size < 0.1) return `${Number((metres * 1000).toPrecision(3))} mm`
  return `${Number(metres.toPrecision(3))} m`
}

/** Decimals that a step of an axis needs: 2 for 0.05. */
export function decimalsOf(step: number): number {
  const [digits, exponent] = step.toExponential().split('e')
  return Math.max(0, (digits!.split('.')[1] ?? '').length - Number(exponent))
}
