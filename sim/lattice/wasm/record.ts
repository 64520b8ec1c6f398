// Where things lie in the kernel's lists, and how they are read. A quantity of all lanes is `wide` bytes; `lane` is the
// offset of the vector in hand (0, or one vector). Material values are one number for all lanes, or as wide as
// all lanes where every lane has its own. The host writes the same places: ../lanes/image.ts.

import { numbersAt } from '../lanes/header'
import { dimensions, own, vectors } from './variant'
import { add, mul, numberBytes, read, splat, sub, Vec, vectorBytes, write } from './vector'

export const wide: usize = vectors * vectorBytes

// Node record: position | velocity | force.
export const x: usize = 0
export const y: usize = wide
export const z: usize = 2 * wide
export const vx: usize = dimensions * wide
export const vy: usize = vx + wide
export const vz: usize = vx + 2 * wide
export const fx: usize = 2 * dimensions * wide
export const fy: usize = fx + wide
export const fz: usize = fx + 2 * wide
export const nodeBytes: usize = 3 * dimensions * wide

export const materialBytes: usize = own ? wide : numberBytes

// Row of the node table: inverse mass | friction (2 numbers in 2-D, 3 in 3-D) | what feelGround() finds: depth, slopes
// along x and z | words: heading (the other node's record or 0), where to tell whether it touches the ground (or 0), what
// is more than the free step (2 held, 1 a sensor asks), 1 when it is in the ground in some lane.
export const frictionAt: usize = (materialBytes + 15) & ~15
export const depthAt: usize = frictionAt + dimensions * wide
export const slopeXAt: usize = depthAt + wide
export const slopeZAt: usize = depthAt + 2 * wide
export const headingAt: usize = depthAt + dimensions * wide
export const touchingAt: usize = headingAt + 4
export const specialAt: usize = headingAt + 8
export const insideAt: usize = headingAt + 12
export const nodeRowBytes: usize = headingAt + 16
/** In specialAt. */
export const isHeld: usize = 2

// Passive strut: stiffness, stiffness * rest, damping | ends (2 words). (Offset 0 is the cheapest for a splat load.)
export const passiveEnds: usize = 3 * materialBytes
export const passiveBytes: usize = (passiveEnds + 8 + 15) & ~15

// Active strut: stiffness, stiffness * rest, damping, limit, power | ends, driven pair of its group | strainCos, strainSin.
export const activeEnds: usize = 5 * materialBytes
export const activeStrain: usize = (activeEnds + 12 + 15) & ~15
export const activeBytes: usize = activeStrain + 2 * wide

// Guided strut: ends, driven pair of its group, first and end of its feedback rows (8 words in all) | stiffness,
// stiffness * rest, damping, limit, power | strainCos, strainSin, stroke, largest step of strain, host's strain, strain.
export const guidedFeedback: usize = 12
export const guidedMaterial: usize = 32
export const guidedStrain: usize = (guidedMaterial + 5 * materialBytes + 15) & ~15
export const guidedBytes: usize = guidedStrain + 6 * wide
/** Feedback row: the sensor's value (a word) | gain. */
export const feedbackBytes: usize = 16 + wide

// Sensor: kind (0 contact, 1 strain), what it looks at (touching of a node; or the ends of a strut), 4 words | rest,
// rate, value.
export const sensorRest: usize = 16
export const sensorBytes: usize = 16 + 3 * wide

// Drag strut: ends | normal, normal - tangential.
export const dragMaterial: usize = own ? 16 : 8
export const dragBytes: usize = (dragMaterial + 2 * materialBytes + 15) & ~15

// Area or volume: its nodes (4 words) | rest, stiffness / rest.
export const fillMaterial: usize = 16
export const fillBytes: usize = (fillMaterial + 2 * materialBytes + 15) & ~15

// Keep-apart pair: ends | stiffness, stiffness * least distance.
export const apartMaterial: usize = own ? 16 : 8
export const apartBytes: usize = (apartMaterial + 2 * materialBytes + 15) & ~15

// Drive group: pairs (sine, cosine): rotor, driven, rotation, turn of the rotation, fresh rotor, fresh rotation |
// steps of its sweep | 1 where fresh ones are to be taken.
export const rotorPair: usize = 0
export const drivenPair: usize = 2 * wide
export const rotationPair: usize = 4 * wide
export const turnPair: usize = 6 * wide
export const freshRotorPair: usize = 8 * wide
export const freshRotationPair: usize = 10 * wide
export const sweepStepsAt: usize = 12 * wide
export const freshMaskAt: usize = 13 * wide
export const groupBytes: usize = 14 * wide

// Prescribed node: its record, driven pair of its group (4 words in all) | start, amplitude | cosine, sine.
export const prescribedStart: usize = 16
export const prescribedAmplitude: usize = 16 + dimensions * wide
export const prescribedPhase: usize = 16 + 2 * dimensions * wide
export const prescribedBytes: usize = prescribedPhase + 2 * wide

/** Number n of the head (../lanes/header.ts). */
@inline export function number(n: usize, lane: usize): Vec {
  return read(<usize>numbersAt + n * wide + lane, 0)
}
/** Material value `index` of the values that begin at `first` of record p. */
@inline export function material(p: usize, first: usize, index: usize, lane: usize): Vec {
  if (own) return read(p + lane, first + index * materialBytes)
  return splat(p, first + index * materialBytes)
}
@inline export function word(at: usize): usize {
  return <usize>load<u32>(at)
}
/** Component c of the vector from node a to node b. */
@inline export function from(a: usize, b: usize, c: usize, lane: usize): Vec {
  return sub(read(b, c + lane), read(a, c + lane))
}
/** a . b, in the order of the reference. */
@inline export function dot(ax: Vec, ay: Vec, az: Vec, bx: Vec, by: Vec, bz: Vec): Vec {
  if (dimensions == 3) return add(add(mul(ax, bx), mul(ay, by)), mul(az, bz))
  return add(mul(ax, bx), mul(ay, by))
}
/**
 * Adds `force` to component c of node a. (The force stands first so that the load comes after what the force is made of:
 * loads keep their order, and one too early costs a register for a long time.)
 */
@inline export function give(a: usize, c: usize, lane: usize, force: Vec): void {
  write(a, c + lane, add(force, read(a, c + lane)))
}
/** Takes `force` from component c of node a. */
@inline export function take(a: usize, c: usize, lane: usize, force: Vec): void {
  write(a, c + lane, sub(read(a, c + lane), force))
}
/** Address of number n of the head. */
@inline export function numberPlace(n: usize, lane: usize): usize {
  return <usize>numbersAt + n * wide + lane
}

// What sample() keeps. Strut: largest |tension|, shortest, longest. Driven strut: positive work, times under load. Node:
// times in contact, lowest, highest.
export const strutSampleBytes: usize = 3 * wide
export const drivenSampleBytes: usize = 2 * wide
export const nodeSampleBytes: usize = 3 * wide
