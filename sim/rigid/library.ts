// What rigid2d.ts and rigid3d.ts share: the version check, layers as bits, and contact lists.

import { check } from '../../shared/check.js'
import type { Contact } from './engine.js'
import type { JointSpec, PairRule, RigidSpec } from './spec.js'

/** The library's name for a rule. */
export const pairRules: { readonly [rule in PairRule]: 'Average' | 'Min' | 'Multiply' | 'Max' } = {
  average: 'Average',
  least: 'Min',
  product: 'Multiply',
  most: 'Max',
}

/** The version that was tested is the version that runs, or nothing does: it is part of every digest. */
export function checkVersion(found: string, expected: string): void {
  check(found === expected, `the rigid-body library is version ${expected} (found ${found})`)
}

/** For each layer, the library's word: membership in the upper 16 bits, what it meets in the lower. */
export function layerWords(
  layers: readonly string[],
  apart: RigidSpec['apart'],
): ReadonlyMap<string, number> {
  const meets = layers.map(() => 0xffff)
  for (const [one, other] of apart ?? []) {
    const [a, b] = [layers.indexOf(one), layers.indexOf(other)]
    meets[a]! &= ~(1 << b)
    meets[b]! &= ~(1 << a)
  }
  return new Map(layers.map((layer, i) => [layer, ((1 << i) << 16) | meets[i]!]))
}

/** Points in a row, in single precision, as the library takes them. */
export function flatPoints(points: readonly (readonly number[])[]): Float32Array {
  return Float32Array.from(points.flat())
}

/** One contact manifold as the library tells it, summed over its points. */
export interface Touch {
  readonly a: number
  readonly b: number
  readonly normal: readonly number[]
  readonly impulse: number
  readonly frictionImpulse: number
  readonly depthM: number
}

/** Contacts in the order of the description, forces as world.ts says. */
export function contactsFrom(touches: readonly Touch[], spec: RigidSpec): Contact[] {
  const { solverRounds = 4, stepSeconds, bodies } = spec
  const perImpulse = solverRounds / ((solverRounds + 1) * stepSeconds)
  return touches.map(({ a, b, normal, impulse, frictionImpulse, depthM }) => ({
    a: bodies[a]!.name,
    b: bodies[b]!.name,
    normal,
    pressN: impulse * perImpulse,
    frictionN: frictionImpulse * perImpulse,
    depthM,
  }))
}

/** How far apart two places are, m. */
export function distanceM(a: ArrayLike<number>, b: ArrayLike<number>): number {
  let sum = 0
  for (let i = 0; i < a.length; i++) sum += (a[i]! - b[i]!) * (a[i]! - b[i]!)
  return Math.sqrt(sum)
}

/** What a joint needs of a description beside its own fields. */
export function bodyNumbersOf(joint: JointSpec, spec: RigidSpec): readonly [number, number] {
  const number = (name: string) => spec.bodies.findIndex((body) => body.name === name)
  return [number(joint.a), number(joint.b)]
}
