// The classic test functions, plain: arrays in, numbers out. Sources are beside their rows in index.ts; all from
// memory. cos, sin and exp are our own (shared/detmath), so that values are the same on every machine.

import { exp } from '../../../shared/detmath/exponential.js'
import { cos, sin } from '../../../shared/detmath/trigonometry.js'

type Numbers = ArrayLike<number>

/** Number of ones. */
export function onemax(x: Numbers): number {
  let ones = 0
  for (let i = 0; i < x.length; i++) ones += x[i]!
  return ones
}

/** Length of the run of ones that begins at the first bit. */
export function leadingOnes(x: Numbers): number {
  let i = 0
  while (i < x.length && x[i] === 1) i++
  return i
}

/** Sum of squares; 0 at the origin. */
export function sphere(x: Numbers): number {
  let sum = 0
  for (let i = 0; i < x.length; i++) sum += x[i]! * x[i]!
  return sum
}

/** 10 n + sum (x^2 - 10 cos 2 pi x); 0 at the origin, about 10^n local minima in +-5.12. */
export function rastrigin(x: Numbers): number {
  let sum = 10 * x.length
  for (let i = 0; i < x.length; i++) sum += x[i]! * x[i]! - 10 * cos(2 * Math.PI * x[i]!)
  return sum
}

/** Sum of 100 (x_{i+1} - x_i^2)^2 + (1 - x_i)^2; 0 at (1, ..., 1), a bent valley. */
export function rosenbrock(x: Numbers): number {
  let sum = 0
  for (let i = 0; i + 1 < x.length; i++) {
    const bend = x[i + 1]! - x[i]! * x[i]!
    const off = 1 - x[i]!
    sum += 100 * bend * bend + off * off
  }
  return sum
}

// ----------------------------------------------------------------- two objectives: f1, f2 = g h(f1, g)

/** Mean of x_2 .. x_n. */
function meanOfRest(x: Numbers): number {
  let sum = 0
  for (let i = 1; i < x.length; i++) sum += x[i]!
  return sum / (x.length - 1)
}

export function zdt1(x: Numbers): [number, number] {
  const f1 = x[0]!
  const g = 1 + 9 * meanOfRest(x)
  return [f1, g * (1 - Math.sqrt(f1 / g))]
}

export function zdt2(x: Numbers): [number, number] {
  const f1 = x[0]!
  const g = 1 + 9 * meanOfRest(x)
  return [f1, g * (1 - (f1 / g) * (f1 / g))]
}

export function zdt3(x: Numbers): [number, number] {
  const f1 = x[0]!
  const g = 1 + 9 * meanOfRest(x)
  return [f1, g * (1 - Math.sqrt(f1 / g) - (f1 / g) * sin(10 * Math.PI * f1))]
}

/** x_1 in [0, 1], the others in [-5, 5]; 21^9 local fronts with n = 10. */
export function zdt4(x: Numbers): [number, number] {
  const f1 = x[0]!
  let g = 1 + 10 * (x.length - 1)
  for (let i = 1; i < x.length; i++) g += x[i]! * x[i]! - 10 * cos(4 * Math.PI * x[i]!)
  return [f1, g * (1 - Math.sqrt(f1 / g))]
}

export function zdt6(x: Numbers): [number, number] {
  const s = sin(6 * Math.PI * x[0]!)
  const f1 = 1 - exp(-4 * x[0]!) * (s * s * s) * (s * s * s)
  const g = 1 + 9 * Math.sqrt(Math.sqrt(meanOfRest(x)))
  return [f1, g * (1 - (f1 / g) * (f1 / g))]
}

// ------------------------------------------------------------------ M objectives, k = n - M + 1 distances

/** Front: sum of f = 1/2. */
export function dtlz1(x: Numbers, objectives: number): number[] {
  const first = objectives - 1
  let g = x.length - first
  for (let i = first; i < x.length; i++) {
    const y = x[i]! - 0.5
    g += y * y - cos(20 * Math.PI * y)
  }
  g *= 100
  return Array.from({ length: objectives }, (_, m) => {
    let f = 0.5 * (1 + g)
    for (let i = 0; i < first - m; i++) f *= x[i]!
    return m === 0 ? f : f * (1 - x[first - m]!)
  })
}

/** Front: sum of f^2 = 1. */
export function dtlz2(x: Numbers, objectives: number): number[] {
  const first = objectives - 1
  let g = 0
  for (let i = first; i < x.length; i++) g += (x[i]! - 0.5) * (x[i]! - 0.5)
  return Array.from({ length: objectives }, (_, m) => {
    let f = 1 + g
    for (let i = 0; i < first - m; i++) f *= cos((x[i]! * Math.PI) / 2)
    return m === 0 ? f : f * sin((x[first - m]! * Math.PI) / 2)
  })
}
