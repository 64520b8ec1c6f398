// Who sends to whom at the end of an epoch. Sources are positions in the list of islands that migrate (controls
// are not in it), ascending, without the island itself and without repeats.

import { check } from '../../shared/check.js'
import { type Stream, stream } from '../../shared/streams.js'
import type { MigrationPlan, Topology } from './plan.js'
import type { Individual } from './types.js'

export interface TopologyRow {
  readonly help: string
  /** What is wrong with this many islands, or undefined. */
  readonly misfit: (islands: number) => string | undefined
  readonly sources: (islands: number, position: number, epoch: number, seed: number) => number[]
  /** Longest way from any island to any other, in migrations; undefined where it is drawn anew each epoch. */
  readonly diameter: (islands: number) => number | undefined
}

const atLeastTwo = (islands: number) => (islands < 2 ? 'migration needs at least 2 islands' : undefined)

export const topologies: Record<Topology, TopologyRow> = {
  ring: {
    help: 'each island receives from the one before it',
    misfit: atLeastTwo,
    sources: (islands, position) => tidy([position - 1 + islands], islands, position),
    diameter: (islands) => islands - 1,
  },
  'two-way-ring': {
    help: 'each island receives from both its neighbours on a ring',
    misfit: atLeastTwo,
    sources: (islands, position) => tidy([position - 1 + islands, position + 1], islands, position),
    diameter: (islands) => Math.floor(islands / 2),
  },
  'torus-4': {
    help: 'islands on a closed grid receive from the four beside them',
    misfit: torusMisfit,
    sources: (islands, position) => grid(islands, position, fourAround),
    diameter: (islands) => {
      const [rows, columns] = torusShape(islands)!
      return Math.floor(rows / 2) + Math.floor(columns / 2)
    },
  },
  'torus-8': {
    help: 'islands on a closed grid receive from the eight around them',
    misfit: torusMisfit,
    sources: (islands, position) => grid(islands, position, eightAround),
    diameter: (islands) => {
      const [rows, columns] = torusShape(islands)!
      return Math.max(Math.floor(rows / 2), Math.floor(columns / 2))
    },
  },
  complete: {
    help: 'each island receives from all others',
    misfit: atLeastTwo,
    sources: (islands, position) =>
      tidy(
        Array.from({ length: islands }, (_, other) => other),
        islands,
        position,
      ),
    diameter: () => 1,
  },
  random: {
    help: 'each island receives from one other, drawn anew every epoch',
    misfit: atLeastTwo,
    sources: (islands, position, epoch, seed) => {
      const hop = 1 + stream(seed, 'topology', epoch, position).below(islands - 1)
      return tidy([position + hop], islands, position)
    },
    diameter: () => undefined,
  },
}

const fourAround = [
  [-1, 0],
  [1, 0],
  [0, -1],
  [0, 1],
] as const
const eightAround = [...fourAround, [-1, -1], [-1, 1], [1, -1], [1, 1]] as const

/** Rows and columns of the torus nearest to a square, both at least 2, or undefined where there is none. */
export function torusShape(islands: number): readonly [number, number] | undefined {
  for (let rows = Math.floor(Math.sqrt(islands)); rows >= 2; rows--) {
    if (islands % rows === 0) return [rows, islands / rows]
  }
  return undefined
}

function torusMisfit(islands: number): string | undefined {
  return torusShape(islands)
    ? undefined
    : `a torus needs rows times columns islands, both at least 2; ${islands} cannot be split so`
}

function grid(islands: number, position: number, around: readonly (readonly [number, number])[]): number[] {
  const shape = torusShape(islands)
  check(shape !== undefined, 'a torus was checked to fit')
  const [rows, columns] = shape
  const row = Math.floor(position / columns)
  const column = position % columns
  const cells = around.map(
    ([down, right]) => ((row + down + rows) % rows) * columns + ((column + right + columns) % columns),
  )
  return tidy(cells, islands, position)
}

function tidy(positions: readonly number[], islands: number, self: number): number[] {
  const wrapped = new Set(positions.map((position) => position % islands))
  wrapped.delete(self)
  return [...wrapped].sort((a, b) => a - b)
}

/** Who leaves, copies of the `ranked` (best first) as they are now: the best, or some drawn; nobody that ever failed. */
export function chooseEmigrants(
  { emigrants, leave }: Pick<MigrationPlan, 'emigrants' | 'leave'>,
  ranked: readonly Individual[],
  draw: Stream,
): Individual[] {
  const sound = ranked.filter((individual) => individual.failedSimulations === 0)
  const count = Math.min(emigrants, sound.length)
  if (leave === 'best') return sound.slice(0, count).map((individual) => ({ ...individual }))
  const order = draw.permutation(sound.length)
  return [...order.subarray(0, count)].map((position) => ({ ...sound[position]! }))
}
