// From genome to machine: nodes, struts, masses, stiffnesses. Lower node of column i is node 2 i, the upper one
// node 2 i + 1. The front of the body is at x = 0, its feet on y = 0.

import { type CrawlerGenome, feet, kinds, none, places, placesPerColumn } from './genome.js'
import { assemble, type Machine, type Member, memberOf } from './machine.js'
import { remembering } from './remember.js'

/** The machine that a (repaired) genome describes. */
export const buildBody = remembering(machineOf)

function machineOf(genome: CrawlerGenome): Machine {
  const columns = genome.bays[0]! + 1
  const positionsM = placeNodes(genome, columns)
  const shape = {
    dimensions: 2,
    columns,
    positionsM,
    footNodes: Array.from({ length: columns }, (_, i) => ({ node: 2 * i, foot: feet[genome.foot[i]!]! })),
    puckNode: 2 * Math.floor(columns / 2) + 1,
    bays: Array.from({ length: columns - 1 }, (_, i) => [0, 1, 2, 3].map((node) => 2 * i + node)),
  } as const
  const { amplitude, phase } = genome
  return assemble(shape, listMembers(genome, columns, positionsM), {
    amplitude,
    phase,
    frequencyHz: genome.frequency[0]!,
  })
}

function placeNodes(genome: CrawlerGenome, columns: number): (readonly [number, number])[] {
  let lengthM = 0
  for (let i = 0; i < columns - 1; i++) lengthM += genome.bayLength[i]!
  const positions: (readonly [number, number])[] = []
  let x = -lengthM
  for (let i = 0; i < columns; i++) {
    positions.push([x, 0], [x, genome.height[i]!])
    x += genome.bayLength[i] ?? 0
  }
  return positions
}

/** Nodes of the five places of column i, in the order of `places`. */
function endsOf(column: number): readonly (readonly [number, number])[] {
  const lower = 2 * column
  const upper = lower + 1
  return [
    [lower, upper],
    [lower, lower + 2],
    [upper, upper + 2],
    [lower, upper + 2],
    [upper, lower + 2],
  ]
}

function listMembers(
  genome: CrawlerGenome,
  columns: number,
  positionsM: readonly (readonly [number, number])[],
): Member[] {
  const members: Member[] = []
  for (let column = 0; column < columns; column++) {
    const used = column === columns - 1 ? 1 : placesPerColumn
    for (let place = 0; place < used; place++) {
      const slot = column * placesPerColumn + place
      if (genome.struts[slot]! === none) continue
      const [a, b] = endsOf(column)[place]!
      const kind = kinds[genome.struts[slot]!]!
      const group = genome.group[slot]!
      members.push(memberOf({ a, b, place: places[place]!, column, kind, group }, positionsM))
    }
  }
  return members
}

/** Words for a node. */
export function nodeName(node: number): string {
  return `${node % 2 === 0 ? 'lower' : 'upper'} ${(node >> 1) + 1}`
}
