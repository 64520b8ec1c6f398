// Shapes and small helpers that the reference tests of rigid bodies share. Angles in degrees where the name says so.

import { type RigidWorld, withRigid } from '../../sim/rigid/rigid2d.js'
import type { BodySpec, RigidSpec, ShapeSpec } from '../../sim/rigid/spec.js'

export const g = 9.81
export const degree = Math.PI / 180

interface Surface {
  readonly friction?: number
  readonly restitution?: number
  readonly density?: number
}
const material = ({ friction = 0.5, restitution = 0, density = 1 }: Surface) => ({
  friction,
  restitution,
  density,
})

export function box(half: readonly number[], surface: Surface = {}): ShapeSpec {
  return { outline: { kind: 'box', halfM: half }, material: material(surface) }
}
export function ball(radiusM: number, surface: Surface = {}): ShapeSpec {
  return { outline: { kind: 'ball', radiusM }, material: material(surface) }
}
export function fixed(
  name: string,
  shapes: readonly ShapeSpec[],
  positionM: readonly number[] = [0, 0],
): BodySpec {
  return { name, fixed: true, positionM, shapes }
}

/** A round body of 1 kg and this inertia over m r^2: 1/2 disc, 2/5 sphere, 1 hoop. */
export function round(
  radiusM: number,
  inertiaRatio: number,
  surface: Surface,
  positionM: readonly number[],
): BodySpec {
  const extra = { massKg: 1, centreM: [0, 0], inertiaKgm2: inertiaRatio * radiusM * radiusM }
  return { name: 'round', positionM, shapes: [ball(radiusM, { ...surface, density: 0 })], extra }
}

/** A level floor whose face is y = 0; slopes are made by turning gravity. */
export function floor(surface: Surface): BodySpec {
  return fixed('floor', [box([60, 0.5], surface)], [0, -0.5])
}
export function downhill(angle: number): readonly [number, number] {
  return [g * Math.sin(angle), -g * Math.cos(angle)]
}

export function run<T>(spec: RigidSpec, use: (world: RigidWorld) => T): T {
  return withRigid(spec, use)
}

/** Steps a world for a time; throws when it fails. */
export function pass(world: RigidWorld, seconds: number): void {
  const fault = world.advance(Math.round(seconds / world.stepSeconds))
  if (fault) throw new Error(`${fault.reason} at ${fault.seconds} s`)
}

/** Slope of the logarithm of an error over that of the step, from the first to the last. */
export function orderOf(errorAt: (step: number) => number, steps: readonly number[]): number {
  const [first, last] = [steps[0]!, steps[steps.length - 1]!]
  return Math.log(errorAt(first) / errorAt(last)) / Math.log(first / last)
}

/** 2 K(sin(a/2)) / pi: period of a pendulum over that of small swings, by the arithmetic-geometric mean. */
export function periodRatio(amplitude: number): number {
  let [a, b] = [1, Math.cos(amplitude / 2)]
  for (let i = 0; i < 40; i++) [a, b] = [(a + b) / 2, Math.sqrt(a * b)]
  return 1 / a
}
