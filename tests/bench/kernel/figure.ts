// The kernel's figures: how many times as fast a replicate is in the kernel as in other programs of the same algebra,
// all measured in turn in one run (rounds.ts).

import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import type { Measure } from '../measure.js'
import { compilerVersion, compilerWords, contestantsFor, disagreement } from './contestants.js'
import { alternate, isWide, type Ratio, type Rounds, ratioOf } from './rounds.js'

interface Row {
  readonly what: string
  readonly fast: string
  readonly than: string
  /** Per replicate, in 2-D and in 3-D; undefined where nothing is asked. */
  readonly goals: readonly [plane: number | undefined, space: number | undefined]
  /** What CI holds, whoever else is on the machine. */
  readonly floor: number
}

export const rows: readonly Row[] = [
  { what: 'kernel f64 / scalar C', fast: 'double', than: 'C scalar', goals: [1.8, 1.8], floor: 1.5 },
  { what: 'kernel f64 / C of 128 bits', fast: 'double', than: 'C 128 bit', goals: [0.9, 0.85], floor: 0.75 },
  { what: 'kernel f64 / C of 256 bits', fast: 'double', than: 'C 256 bit', goals: [0.45, 0.42], floor: 0.38 },
  { what: 'kernel f64 / TypeScript', fast: 'double', than: 'reference', goals: [4, 4], floor: 3.5 },
  { what: 'kernel f32 / scalar f32 C', fast: 'single', than: 'C scalar f32', goals: [3.5, 3.5], floor: 3 },
  {
    what: 'whole crawler evaluation / its kernel alone',
    fast: 'crawler',
    than: 'crawler-kernel',
    goals: [0.8, 0.8],
    floor: 0.6,
  },
  {
    what: 'one replicate alone / scalar C',
    fast: 'double-alone',
    than: 'C scalar',
    goals: [undefined, undefined],
    floor: 0.6,
  },
]

/** Steps after which all must agree, and how well: relative to the body's extent. */
const agreementSteps = 500
const agreement = { double: 1e-9, single: 1e-3 } as const

/** Where lattice.c is and what runs mover.ts. */
export interface Paths {
  readonly source: string
  readonly mover: string
  readonly folder: string
}

/** In the compiled benchmark: lattice.c stays with the sources. */
export function compiledPaths(folder: string): Paths {
  const here = fileURLToPath(new URL('.', import.meta.url))
  const root = join(here, '..', '..', '..', '..')
  return {
    source: join(root, 'tests', 'bench', 'kernel', 'lattice.c'),
    mover: join(here, 'mover.js'),
    folder,
  }
}

export interface Finding {
  readonly row: Row
  readonly dimensions: 2 | 3
  readonly ratio: Ratio
  /** Measurements thrown away because they were spread too widely. */
  readonly repeated: number
}

/**
 * All rows for one body; those whose contestants are not here are left out. Measured again, at most `again` times, while
 * some row is spread too widely; the least wide measurement counts.
 */
export async function measureBody(
  dimensions: 2 | 3,
  paths: Paths,
  rounds: number,
  again: number,
): Promise<Finding[]> {
  const contestants = contestantsFor(dimensions, paths)
  const named = (name: string) => contestants.find((one) => one.name === name)
  const present = rows.filter(({ fast, than }) => named(fast) && named(than))
  for (const { fast, than } of present.filter(({ fast }) => fast !== 'crawler')) {
    const apart = await disagreement(named(fast)!, named(than)!, agreementSteps)
    const most = than.includes('f32') ? agreement.single : agreement.double
    if (!(apart <= most))
      throw new Error(`${fast} and ${than} differ by ${apart} after ${agreementSteps} steps`)
  }
  let best: Rounds = await alternate(contestants, rounds)
  let repeated = 0
  const widest = (some: Rounds) =>
    Math.max(...present.map(({ fast, than }) => spread(ratioOf(some, fast, than))))
  while (repeated < again && present.some(({ fast, than }) => isWide(ratioOf(best, fast, than)))) {
    repeated += 1
    const next = await alternate(contestants, rounds)
    if (widest(next) < widest(best)) best = next
  }
  return present.map((row) => ({ row, dimensions, ratio: ratioOf(best, row.fast, row.than), repeated }))
}

const spread = ({ p10, p90 }: Ratio) => p90 / p10

/** One run of the figure `kernel`. */
export async function kernelMeasures(
  folder: string,
  quick: boolean,
  say: (sentence: string) => void,
): Promise<Measure[]> {
  const compiler = compilerVersion()
  if (compiler === undefined) say('there is no gcc on this machine: the rows with C are left out')
  else say(`${compiler}, ${compilerWords.join(' ')}`)
  const measures: Measure[] = []
  for (const dimensions of [2, 3] as const) {
    for (const finding of await measureBody(
      dimensions,
      compiledPaths(folder),
      quick ? 5 : 15,
      quick ? 1 : 3,
    )) {
      measures.push(measureOf(finding))
    }
  }
  return measures
}

function measureOf({ row, dimensions, ratio, repeated }: Finding): Measure {
  const goal = row.goals[dimensions - 2]
  const remeasured = repeated === 0 ? '' : `, measured again ${repeated} times`
  return {
    name: `${row.what}, ${dimensions}-D`,
    unit: 'x',
    ...(goal === undefined ? {} : { goal: { atLeast: goal } }),
    value: ratio.median,
    remark: `p10 to p90 ${ratio.p10.toFixed(2)} to ${ratio.p90.toFixed(2)}${remeasured}`,
  }
}
