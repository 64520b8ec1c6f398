// An evaluation asks for the body of its genome several times (can it be made, what does it cost, simulate it), and
// building it costs as much as hundreds of steps: the last one built is kept.

import type { Genome } from '../../../shared/genome.js'

/** `build`, kept for the last genome: genomes are never changed in place. Nobody may alter what is built either. */
export function remembering<G extends Genome, Built>(build: (genome: G) => Built): (genome: G) => Built {
  let last: { readonly genome: G; readonly built: Built } | undefined
  return (genome) => {
    if (last?.genome !== genome) last = { genome, built: build(genome) }
    return last.built
  }
}
