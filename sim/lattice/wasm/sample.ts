// What is kept of the present moment for whoever measures: of struts the largest tension and the shortest and longest
// length, of driven struts the positive work since the last sample and whether they are under load, of nodes contact and
// the lowest and highest place. The same sums in the same order as takeSample() in ../tally.ts.

import {
  activeEnd, activeFirst, drivenSamples, guidedEnd, guidedFirst, loadedShareAt, nodesEnd, nodeSamples, nodesFirst, oneAt,
  passiveEnd, passiveFirst, sampleSecondsAt, strutSamples, topAt,
} from '../lanes/header'
import { depthOf } from './ground'
import {
  activeBytes, activeEnds, activeStrain, dot, drivenSampleBytes, from, guidedBytes, guidedMaterial, guidedStrain,
  material, nodeBytes, nodeSampleBytes, number, passiveBytes, passiveEnds, strutSampleBytes, vx, vy, vz, wide, word,
  x, y, z,
} from './record'
import { withinPower } from './struts'
import { dimensions, vectors } from './variant'
import {
  abs, add, anyOf, atLeast, atMost, div, less, mul, neg, only, read, sqrt, sub, Vec, vectorBytes, write,
} from './vector'

@inline function squareOf(a: usize, b: usize, lane: usize): Vec {
  const dx = from(a, b, x, lane)
  const dy = from(a, b, y, lane)
  const dz = dimensions == 3 ? from(a, b, z, lane) : dx
  return dot(dx, dy, dz, dx, dy, dz)
}
/** d . dv */
@inline function alongOf(a: usize, b: usize, lane: usize): Vec {
  const dz = dimensions == 3 ? from(a, b, z, lane) : from(a, b, x, lane)
  const dvz = dimensions == 3 ? from(a, b, vz, lane) : from(a, b, vx, lane)
  return dot(
    from(a, b, x, lane), from(a, b, y, lane), dz, from(a, b, vx, lane), from(a, b, vy, lane), dvz,
  )
}

/** k - commanded / |d| + c (d . dv) / q */
@inline function scaleOf(p: usize, first: usize, commanded: Vec, perLength: Vec, perQ: Vec, along: Vec, lane: usize): Vec {
  const damping = material(p, first, 2, lane)
  return add(sub(material(p, first, 0, lane), mul(commanded, perLength)), mul(mul(damping, along), perQ))
}

@inline function keep(at: usize, lane: usize, tension: Vec, length: Vec): void {
  write(at, lane, atLeast(read(at, lane), tension))
  write(at, wide + lane, atMost(read(at, wide + lane), length))
  write(at, 2 * wide + lane, atLeast(read(at, 2 * wide + lane), length))
}

/** Adds the work of a strut whose tension is scale * |d|, and one where that is a load; most: limit / |d|. */
@inline function keepWork(at: usize, scale: Vec, along: Vec, most: Vec, lane: usize): void {
  const power = mul(neg(scale), along)
  const one = number(oneAt, lane)
  const zero = sub(one, one)
  write(at, lane, add(read(at, lane), mul(atLeast(power, zero), number(sampleSecondsAt, lane))))
  const loaded = less(mul(number(loadedShareAt, lane), most), abs(scale))
  write(at, wide + lane, add(read(at, wide + lane), only(loaded, one)))
}

@inline function takePassive(p: usize, a: usize, b: usize, at: usize, lane: usize): void {
  const q = squareOf(a, b, lane)
  const perQ = div(number(oneAt, lane), q)
  const length = sqrt(q)
  const commanded = material(p, 0, 1, lane)
  const scale = scaleOf(p, 0, commanded, mul(length, perQ), perQ, alongOf(a, b, lane), lane)
  keep(at, lane, mul(abs(scale), length), length)
}

function samplePassive(at: usize): void {
  const end = word(passiveEnd)
  for (let p = word(passiveFirst); p < end; p += passiveBytes) {
    const a = word(p + passiveEnds)
    const b = word(p + passiveEnds + 4)
    takePassive(p, a, b, at, 0)
    if (vectors > 1) takePassive(p, a, b, at, vectorBytes)
    at += strutSampleBytes
  }
}

@inline function takeActive(
  p: usize, a: usize, b: usize, group: usize, at: usize, work: usize, lane: usize,
): void {
  const one = number(oneAt, lane)
  const q = squareOf(a, b, lane)
  const perQ = div(one, q)
  const length = sqrt(q)
  const perLength = mul(length, perQ)
  const along = alongOf(a, b, lane)
  const drive = add(
    mul(read(group, lane), read(p, activeStrain + lane)),
    mul(read(group, wide + lane), read(p, activeStrain + wide + lane)),
  )
  const commanded = mul(material(p, 0, 1, lane), add(one, drive))
  const most = mul(material(p, 0, 3, lane), perLength)
  const free = scaleOf(p, 0, commanded, perLength, perQ, along, lane)
  const scale = withinPower(atMost(atLeast(free, neg(most)), most), along, material(p, 0, 4, lane))
  keep(at, lane, mul(abs(scale), length), length)
  keepWork(work, scale, along, most, lane)
}

function sampleActive(at: usize, work: usize): void {
  const end = word(activeEnd)
  for (let p = word(activeFirst); p < end; p += activeBytes) {
    const a = word(p + activeEnds)
    const b = word(p + activeEnds + 4)
    const group = word(p + activeEnds + 8)
    takeActive(p, a, b, group, at, work, 0)
    if (vectors > 1) takeActive(p, a, b, group, at, work, vectorBytes)
    at += strutSampleBytes
    work += drivenSampleBytes
  }
}

function takeGuided(p: usize, a: usize, b: usize, at: usize, work: usize, lane: usize): void {
  const one = number(oneAt, lane)
  const q = squareOf(a, b, lane)
  const perQ = div(one, q)
  const length = sqrt(q)
  const perLength = mul(length, perQ)
  const along = alongOf(a, b, lane)
  const strain = read(p, guidedStrain + 5 * wide + lane)
  const commanded = mul(material(p, guidedMaterial, 1, lane), add(one, strain))
  const most = mul(material(p, guidedMaterial, 3, lane), perLength)
  const free = scaleOf(p, guidedMaterial, commanded, perLength, perQ, along, lane)
  const held = atMost(atLeast(free, neg(most)), most)
  const scale = withinPower(held, along, material(p, guidedMaterial, 4, lane))
  keep(at, lane, mul(abs(scale), length), length)
  keepWork(work, scale, along, most, lane)
}

function sampleGuided(at: usize, work: usize): void {
  const end = word(guidedEnd)
  for (let p = word(guidedFirst); p < end; p += guidedBytes) {
    const a = word(p)
    const b = word(p + 4)
    takeGuided(p, a, b, at, work, 0)
    if (vectors > 1) takeGuided(p, a, b, at, work, vectorBytes)
    at += strutSampleBytes
    work += drivenSampleBytes
  }
}

@inline function takeNode(o: usize, at: usize, lane: usize): void {
  const height = read(o, y + lane)
  if (anyOf(less(height, number(topAt, lane)))) {
    const one = number(oneAt, lane)
    write(at, lane, add(read(at, lane), only(less(sub(one, one), depthOf(o, lane)), one)))
  }
  write(at, wide + lane, atMost(read(at, wide + lane), height))
  write(at, 2 * wide + lane, atLeast(read(at, 2 * wide + lane), height))
}

function sampleNodes(): void {
  const end = word(nodesEnd)
  let at = word(nodeSamples)
  for (let o = word(nodesFirst); o < end; o += nodeBytes) {
    takeNode(o, at, 0)
    if (vectors > 1) takeNode(o, at, vectorBytes)
    at += nodeSampleBytes
  }
}

@inline function count(first: usize, end: usize, bytes: usize): usize {
  return (word(end) - word(first)) / bytes
}

export function sample(): void {
  const passives = count(passiveFirst, passiveEnd, passiveBytes)
  const actives = count(activeFirst, activeEnd, activeBytes)
  const struts = word(strutSamples)
  const driven = word(drivenSamples)
  samplePassive(struts)
  sampleActive(struts + passives * strutSampleBytes, driven)
  sampleGuided(struts + (passives + actives) * strutSampleBytes, driven + actives * drivenSampleBytes)
  sampleNodes()
}
