// Sensors, then the commanded strain of every guided strut (../reference/guide.ts). Once a step, first of all.

import { guidedEnd, guidedFirst, sensorEnd, sensorFirst } from '../lanes/header'
import {
  dot, feedbackBytes, from, guidedBytes, guidedFeedback, guidedStrain, sensorBytes, sensorRest, wide, word, x, y, z,
} from './record'
import { dimensions, vectors } from './variant'
import { add, atLeast, atMost, div, mul, neg, read, sqrt, sub, Vec, vectorBytes, write } from './vector'

@inline function sense(p: usize, strain: bool, lane: usize): void {
  const a = word(p + 4)
  let raw: Vec
  if (strain) {
    const b = word(p + 8)
    const dx = from(a, b, x, lane)
    const dy = from(a, b, y, lane)
    const dz = dimensions == 3 ? from(a, b, z, lane) : dx
    const rest = read(p, sensorRest + lane)
    raw = div(sub(sqrt(dot(dx, dy, dz, dx, dy, dz)), rest), rest)
  } else {
    raw = read(a, lane)
  }
  const before = read(p, sensorRest + 2 * wide + lane)
  const rate = read(p, sensorRest + wide + lane)
  write(p, sensorRest + 2 * wide + lane, add(before, mul(sub(raw, before), rate)))
}

@inline function aim(p: usize, lane: usize): void {
  const group = word(p + 8)
  let target = add(
    add(read(p, guidedStrain + 4 * wide + lane), mul(read(group, lane), read(p, guidedStrain + lane))),
    mul(read(group, wide + lane), read(p, guidedStrain + wide + lane)),
  )
  const end = word(p + guidedFeedback + 4)
  for (let row = word(p + guidedFeedback); row < end; row += feedbackBytes) {
    target = add(target, mul(read(row, 16 + lane), read(word(row), lane)))
  }
  const stroke = read(p, guidedStrain + 2 * wide + lane)
  const most = read(p, guidedStrain + 3 * wide + lane)
  const strain = read(p, guidedStrain + 5 * wide + lane)
  const wanted = sub(atMost(atLeast(target, neg(stroke)), stroke), strain)
  write(p, guidedStrain + 5 * wide + lane, add(strain, atMost(atLeast(wanted, neg(most)), most)))
}

export function guide(): void {
  const lastSensor = word(sensorEnd)
  for (let p = word(sensorFirst); p < lastSensor; p += sensorBytes) {
    const strain = word(p) != 0
    sense(p, strain, 0)
    if (vectors > 1) sense(p, strain, vectorBytes)
  }
  const end = word(guidedEnd)
  for (let p = word(guidedFirst); p < end; p += guidedBytes) {
    aim(p, 0)
    if (vectors > 1) aim(p, vectorBytes)
  }
}
