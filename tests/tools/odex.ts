// odex 2.0.4, Hairer and Wanner's extrapolation code ODEX in JavaScript: a second opinion on equations of motion. The
// types it carries are sources that a strict compiler does not take.

import { createRequire } from 'node:module'

export interface OdexSolver {
  absoluteTolerance: number
  relativeTolerance: number
  denseOutput: boolean
  /** What to hand to `solve` to be called at every multiple of `step`. */
  grid(step: number, call: (t: number, y: number[]) => unknown): OdexOutput
  solve(
    rates: (t: number, y: number[]) => number[],
    from: number,
    start: number[],
    to: number,
    output?: OdexOutput,
  ): { y: number[] }
}
declare const isOutput: unique symbol
export interface OdexOutput {
  readonly [isOutput]: true
}

export const { Solver } = createRequire(import.meta.url)('odex') as {
  Solver: new (size: number) => OdexSolver
}
