// A process that moves one of the bodies of the kernel's benchmark and tells the CPU it took: the kernel or the
// reference. The same lines as lattice.c: "run STEPS" is answered with nanoseconds.

import { createInterface } from 'node:readline'
import { advance } from '../../../sim/lattice/advance.js'
import { advanceLanes, lanesMost, packLanes, unpackLane } from '../../../sim/lattice/lanes.js'
import type { Lattice } from '../../../sim/lattice/layout.js'
import { benchReplicates } from './bodies.js'
import { evaluationTimer, kernelTimer } from './evaluations.js'

/**
 * double-alone: one replicate, in the module of one lane. crawler and crawler-kernel: whole evaluations and their kernel
 * alone (evaluations.ts); a step is one evaluation of every founder.
 */
export type MoverKind = 'reference' | 'double' | 'double-alone' | 'single' | 'crawler' | 'crawler-kernel'

/** How many replicates a process of this kind moves at a time. */
export function replicatesOf(kind: MoverKind): number {
  if (kind === 'double') return lanesMost.double
  return kind === 'single' ? lanesMost.single : 1
}

/** Serves lines until the other side closes. */
function serveMover(kind: MoverKind, dimensions: 2 | 3): void {
  const lattices = benchReplicates(dimensions, replicatesOf(kind))
  const move = moverOf(kind, lattices)
  const lines = createInterface({ input: process.stdin })
  lines.on('line', (line) => {
    const [word, count] = line.split(' ')
    if (word === 'run') {
      const from = process.cpuUsage()
      const faults = move.run(Number(count))
      const { user, system } = process.cpuUsage(from)
      if (faults.some((fault) => fault !== undefined)) throw new Error(JSON.stringify(faults))
      console.log(1000 * (user + system))
    } else if (word === 'state') {
      console.log(move.state().join(' '))
    }
  })
}

/** A timer that counts its own CPU, in microseconds. */
function serveTimer(time: (times: number) => number): void {
  createInterface({ input: process.stdin }).on('line', (line) =>
    console.log(1000 * time(Number(line.slice(4)))),
  )
}

function moverOf(kind: MoverKind, lattices: readonly Lattice[]) {
  const places = (all: readonly Lattice[]) =>
    all.flatMap(({ nodes, stride, dimensions }) =>
      Array.from(nodes).filter((_, i) => i % stride < dimensions),
    )
  if (kind === 'reference') {
    const [lattice] = lattices as [Lattice]
    return { run: (steps: number) => [advance(lattice, steps)], state: () => places(lattices) }
  }
  const lanes = packLanes(lattices, { precision: kind === 'single' ? 'single' : 'double' })
  return {
    run: (steps: number) => advanceLanes(lanes, steps),
    state: () => places(lattices.map((_, i) => unpackLane(lanes, i))),
  }
}

const [, , kind, dimensions] = process.argv
if (kind !== undefined && dimensions !== undefined) {
  const space = dimensions === '3' ? 3 : 2
  if (kind === 'crawler') serveTimer(evaluationTimer(space))
  else if (kind === 'crawler-kernel') serveTimer(kernelTimer(space))
  else serveMover(kind as MoverKind, space)
}
