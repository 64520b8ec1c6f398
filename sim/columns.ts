// The columns of a result. Apart from problem.ts, because whoever only simulates needs no checks of problems.

import type { AnyProblem } from '../shared/problem.js'

/** Columns of a result (shared/result.ts): objectives, then measures, in order of declaration. */
export function columnsOf(problem: Pick<AnyProblem, 'objectives' | 'measures'>): readonly string[] {
  return [...Object.keys(problem.objectives), ...Object.keys(problem.measures)]
}
