// Who takes part in the kernel's benchmark: the kernel, the reference in TypeScript, and the plain C program compiled
// on the spot for this very processor.

import { spawnSync } from 'node:child_process'
import { existsSync, readFileSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { benchReplicates, bytesForC } from './bodies.js'
import { type MoverKind, replicatesOf } from './mover.js'
import { type Contestant, stateAfter } from './rounds.js'

/** A variant of lattice.c: bytes of a vector, 0 for plain numbers. */
interface Program {
  readonly name: string
  readonly number: 'double' | 'float'
  readonly bytes: 0 | 16 | 32
}

const programs: readonly Program[] = [
  { name: 'C scalar', number: 'double', bytes: 0 },
  { name: 'C 128 bit', number: 'double', bytes: 16 },
  { name: 'C 256 bit', number: 'double', bytes: 32 },
  { name: 'C scalar f32', number: 'float', bytes: 0 },
]

const stepPace = { warmUpNanoseconds: 400e6, sampleNanoseconds: 25e6 } as const
/**
 * What surrounds the kernel is called a few times an evaluation: its fast code takes some hundreds of them, which a search
 * has behind it within its first minute; and workers evaluate without a break, so that a sample of one or two, after
 * others have had the processor's caches, would be none of theirs.
 */
const evaluationPace = { warmUpNanoseconds: 3e9, sampleNanoseconds: 150e6 } as const

export const compilerWords = ['-O3', '-march=native', '-ffast-math']

/** The first line of what the C compiler says of itself, or undefined where there is none. */
export function compilerVersion(): string | undefined {
  const done = spawnSync('gcc', ['--version'], { encoding: 'utf8' })
  return done.status === 0 ? done.stdout.split('\n')[0] : undefined
}

/** Whether 256-bit vectors are the processor's own: the compiler would make two halves of them elsewhere. */
function hasWideVectors(): boolean {
  return existsSync('/proc/cpuinfo') && /\bavx2\b/.test(readFileSync('/proc/cpuinfo', 'utf8'))
}

/** All contestants for one body. `source` is lattice.c, `mover` the compiled mover.ts, `folder` takes what is made. */
export function contestantsFor(
  dimensions: 2 | 3,
  { source, mover, folder }: { readonly source: string; readonly mover: string; readonly folder: string },
): Contestant[] {
  return [...moversFor(dimensions, mover), ...programsFor(dimensions, source, folder)]
}

function moversFor(dimensions: 2 | 3, mover: string): Contestant[] {
  const kinds: readonly MoverKind[] = [
    'double',
    'double-alone',
    'single',
    'reference',
    'crawler',
    'crawler-kernel',
  ]
  return kinds.map((kind) => ({
    name: kind,
    program: process.execPath,
    args: [mover, kind, String(dimensions)],
    opening: [],
    replicates: replicatesOf(kind),
    leastSteps: kind.startsWith('crawler') ? 1 : 64,
    ...(kind.startsWith('crawler') ? evaluationPace : stepPace),
  }))
}

function programsFor(dimensions: 2 | 3, source: string, folder: string): Contestant[] {
  if (compilerVersion() === undefined) return []
  const body = join(folder, `body-${dimensions}`)
  writeFileSync(body, bytesForC(benchReplicates(dimensions, 8)))
  return programs
    .filter(({ bytes }) => bytes < 32 || hasWideVectors())
    .map(({ name, number, bytes }) => {
      const program = join(folder, `${number}-${bytes}-${dimensions}`)
      const variant = [`-DDIM=${dimensions}`, `-DNUM=${number}`, `-DBYTES=${bytes}`]
      const done = spawnSync('gcc', [...compilerWords, ...variant, '-o', program, source, '-lm'], {
        encoding: 'utf8',
      })
      if (done.status !== 0) throw new Error(`gcc cannot compile ${source}: ${done.stderr}`)
      const replicates = bytes === 0 ? 1 : (2 * bytes) / (number === 'double' ? 8 : 4)
      const opening = [`load ${body}`]
      return { name, program, args: [], opening, replicates, leastSteps: 64, ...stepPace }
    })
}

/**
 * Largest distance between where two contestants put a node of the first replicate after some steps, over the body's
 * extent: a figure means nothing when the programs do different things.
 */
export async function disagreement(a: Contestant, b: Contestant, steps: number): Promise<number> {
  const [one, other] = [await stateAfter(a, steps), await stateAfter(b, steps)]
  const count = Math.min(one.length / a.replicates, other.length / b.replicates)
  let largest = 0
  let extent = 0
  for (let i = 0; i < count; i++) {
    largest = Math.max(largest, Math.abs(one[i]! - other[i]!))
    extent = Math.max(extent, Math.abs(one[i]!))
  }
  return largest / extent
}
