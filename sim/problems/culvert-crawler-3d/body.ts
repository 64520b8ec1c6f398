// From genome to machine. Column i has node 3 i on the left (-z), 3 i + 1 on the right (+z) and 3 i + 2 above. The front of
// the body is at x = 0, its feet on the bottom of the pipe.

import { feet, kinds, none } from '../culvert-crawler/genome.js'
import { assemble, type FootNode, type Machine, type Member, memberOf } from '../culvert-crawler/machine.js'
import { remembering } from '../culvert-crawler/remember.js'
import { invertM } from './floor.js'
import { type Crawler3dGenome, places, placesInColumn, placesPerColumn } from './genome.js'

/** The machine that a (repaired) genome describes. */
export const buildBody3d = remembering(machineOf)

function machineOf(genome: Crawler3dGenome): Machine {
  const columns = genome.bays[0]! + 1
  const positionsM = placeNodes(genome, columns)
  const shape = {
    dimensions: 3,
    columns,
    positionsM,
    footNodes: listFeet(genome, columns),
    puckNode: 3 * Math.floor(columns / 2) + 2,
    bays: Array.from({ length: columns - 1 }, (_, i) => [0, 1, 2, 3, 4, 5].map((node) => 3 * i + node)),
  } as const
  const { amplitude, phase } = genome
  return assemble(shape, listMembers(genome, columns, positionsM), {
    amplitude,
    phase,
    frequencyHz: genome.frequency[0]!,
  })
}

function placeNodes(genome: Crawler3dGenome, columns: number): number[][] {
  let lengthM = 0
  for (let i = 0; i < columns - 1; i++) lengthM += genome.bayLength[i]!
  const positions: number[][] = []
  let x = -lengthM
  for (let i = 0; i < columns; i++) {
    const halfM = genome.width[i]! / 2
    const floorM = invertM(halfM)
    positions.push([x, floorM, -halfM], [x, floorM, halfM], [x, floorM + genome.height[i]!, 0])
    x += genome.bayLength[i] ?? 0
  }
  return positions
}

/** Feet look along their chain: to the next column, and those of the first column away from the one behind. */
function listFeet(genome: Crawler3dGenome, columns: number): FootNode[] {
  return Array.from({ length: 2 * columns }, (_, i): FootNode => {
    const node = 3 * (i >> 1) + (i % 2)
    const isFront = i >> 1 === columns - 1
    const toward = { node: isFront ? node - 3 : node + 3, isBehind: isFront }
    return { node, foot: feet[genome.foot[i]!]!, toward }
  })
}

function listMembers(
  genome: Crawler3dGenome,
  columns: number,
  positionsM: readonly (readonly number[])[],
): Member[] {
  const members: Member[] = []
  for (let column = 0; column < columns; column++) {
    const used = column === columns - 1 ? placesInColumn : placesPerColumn
    for (let place = 0; place < used; place++) {
      const slot = column * placesPerColumn + place
      if (genome.struts[slot]! === none) continue
      const { name, a, b } = places[place]!
      const kind = kinds[genome.struts[slot]!]!
      const group = genome.group[slot]!
      const ends = { a: 3 * column + a, b: 3 * column + b }
      members.push(memberOf({ ...ends, place: name, column, kind, group }, positionsM))
    }
  }
  return members
}

/** Words for a node. */
export function nodeName3d(node: number): string {
  return `${['left', 'right', 'upper'][node % 3]} ${Math.floor(node / 3) + 1}`
}
