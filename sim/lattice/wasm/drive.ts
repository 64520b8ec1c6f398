// The drive at a new time (../reference/drive.ts): rotors turned on, or replaced by fresh sines that the host has left in
// the group's record; how far the drive has grown; the nodes that are moved along a path.

import {
  freshAt, grownAt, groupEnd, groupFirst, oneAt, prescribedEnd, prescribedFirst, rampSteps, since, stepAt, sweeping,
} from '../lanes/header'
import {
  drivenPair, freshMaskAt, freshRotationPair, freshRotorPair, groupBytes, number, numberPlace, prescribedAmplitude,
  prescribedBytes, prescribedPhase, prescribedStart, rotationPair, rotorPair, sweepStepsAt, turnPair, vx, wide, word, x,
} from './record'
import { dimensions, vectors } from './variant'
import {
  add, choose, differ, div, less, Mask, mul, read, spread, sub, Vec, vectorBytes, write,
} from './vector'

/** Turns the pair at `at` of record p by the pair at `by`, in the lanes of `mask`; in the others takes `instead`. */
@inline function turn(p: usize, at: usize, by: usize, lane: usize): void {
  const s = read(p, at + lane)
  const c = read(p, at + wide + lane)
  const ds = read(p, by + lane)
  const dc = read(p, by + wide + lane)
  write(p, at + lane, add(mul(s, dc), mul(c, ds)))
  write(p, at + wide + lane, sub(mul(c, dc), mul(s, ds)))
}

/** As turn(), but only in the lanes of `mask`. */
@inline function turnSome(p: usize, at: usize, by: usize, mask: Mask, lane: usize): void {
  const s = read(p, at + lane)
  const c = read(p, at + wide + lane)
  const ds = read(p, by + lane)
  const dc = read(p, by + wide + lane)
  write(p, at + lane, choose(mask, add(mul(s, dc), mul(c, ds)), s))
  write(p, at + wide + lane, choose(mask, sub(mul(c, dc), mul(s, ds)), c))
}

/** Takes the pair at `fresh` in the lanes that are marked. */
@inline function takeFresh(p: usize, at: usize, fresh: usize, marked: Mask, lane: usize): void {
  write(p, at + lane, choose(marked, read(p, fresh + lane), read(p, at + lane)))
  write(p, at + wide + lane, choose(marked, read(p, fresh + wide + lane), read(p, at + wide + lane)))
}

/** A step in which nothing is fresh; `now` is the number of steps since the drive began. */
@inline function turnOn(p: usize, now: Vec, sweeps: bool, lane: usize): void {
  turn(p, rotorPair, rotationPair, lane)
  if (sweeps) turnSome(p, rotationPair, turnPair, less(now, read(p, sweepStepsAt + lane)), lane)
}

/** A step in which some lanes take fresh sines. */
@inline function renew(p: usize, now: Vec, lane: usize): void {
  const zero = sub(now, now)
  const marked = differ(read(p, freshMaskAt + lane), zero)
  const left = less(read(p, freshMaskAt + lane), number(oneAt, lane))
  turn(p, rotorPair, rotationPair, lane)
  takeFresh(p, rotorPair, freshRotorPair, marked, lane)
  turnSome(p, rotationPair, turnPair, less(now, choose(left, read(p, sweepStepsAt + lane), zero)), lane)
  takeFresh(p, rotationPair, freshRotationPair, marked, lane)
}

@inline function grow(p: usize, lane: usize): void {
  const grown = number(grownAt, lane)
  write(p, drivenPair + lane, mul(read(p, rotorPair + lane), grown))
  write(p, drivenPair + wide + lane, mul(read(p, rotorPair + wide + lane), grown))
}

@inline function place(p: usize, o: usize, group: usize, lane: usize): void {
  const h = number(stepAt, lane)
  const swing = add(
    mul(read(group, lane), read(p, prescribedPhase + lane)),
    mul(read(group, wide + lane), read(p, prescribedPhase + wide + lane)),
  )
  for (let c: usize = 0; c < dimensions * wide; c += wide) {
    const next = add(read(p + c, prescribedStart + lane), mul(read(p + c, prescribedAmplitude + lane), swing))
    write(o + c, vx + lane, div(sub(next, read(o + c, x + lane)), h))
    write(o + c, x + lane, next)
  }
}

export function drive(): void {
  const steps = load<i32>(since) + 1
  store<i32>(since, steps)
  if (steps < 0) return
  const ramp = load<i32>(rampSteps)
  const grown = steps >= ramp ? 1 : <f64>steps / <f64>ramp
  write(numberPlace(grownAt, 0), 0, spread(grown))
  if (vectors > 1) write(numberPlace(grownAt, 0), vectorBytes, spread(grown))
  const sweeps = word(sweeping) != 0
  const fresh = steps == load<i32>(freshAt)
  const now = spread(<f64>steps)
  const end = word(groupEnd)
  for (let p = word(groupFirst); p < end; p += groupBytes) {
    if (fresh) {
      renew(p, now, 0)
      if (vectors > 1) renew(p, now, vectorBytes)
    } else {
      turnOn(p, now, sweeps, 0)
      if (vectors > 1) turnOn(p, now, sweeps, vectorBytes)
    }
    grow(p, 0)
    if (vectors > 1) grow(p, vectorBytes)
  }
  const lastPrescribed = word(prescribedEnd)
  for (let p = word(prescribedFirst); p < lastPrescribed; p += prescribedBytes) {
    const o = word(p)
    const group = word(p + 4)
    place(p, o, group, 0)
    if (vectors > 1) place(p, o, group, vectorBytes)
  }
}
