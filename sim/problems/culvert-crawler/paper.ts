// What a person is told of a crawler: its parts with units, and the cautions that leave with it beyond those that
// follow from its use. A simulation is no certificate, and a machine found by a search works at the edge of its model.

import type { Caution } from '../../../shared/problem.js'
import { buildBody, type Member } from './body.js'
import type { CrawlerGenome } from './genome.js'
import { numbers } from './numbers.js'

const mm = (metres: number) => `${(metres * 1000).toFixed(1)} mm`
const grams = (kg: number) => `${(kg * 1000).toFixed(1)} g`

const materials: { readonly [kind: string]: string } = {
  soft: 'silicone rubber tube, Shore A 10',
  firm: 'silicone rubber tube, Shore A 20',
  hard: 'silicone rubber tube, Shore A 30',
  actuator: 'bellows actuator',
}

/** Lines for a person, part by part, with units. */
export function describeCrawler(genome: CrawlerGenome): readonly string[] {
  const body = buildBody(genome)
  const lines = [
    `Body: ${body.columns - 1} bays, ${mm(-body.positionsM[0]![0])} long, ${grams(body.massKg)} with the puck ` +
      `(${grams(numbers.puckKg)}), ${grams(body.materialKg)} of material.`,
    `Tubes: ${mm(numbers.strutDiameterM)} mean diameter, ${mm(numbers.strutAreaM2 / Math.PI / numbers.strutDiameterM)} wall.`,
    `Puck: on the upper node of column ${(body.puckNode >> 1) + 1}.`,
  ]
  for (let column = 0; column < body.columns; column++) {
    const [x] = body.positionsM[2 * column]!
    const heightM = body.positionsM[2 * column + 1]![1]
    lines.push(
      `Column ${column + 1}: ${mm(-x)} behind the front, ${mm(heightM)} high, foot ${body.feet[column]}.`,
    )
  }
  for (const member of body.members) lines.push(memberLine(member))
  lines.push(`Drive: ${body.frequencyHz.toFixed(3)} Hz for all groups.`)
  const used = new Set(body.members.map((member) => member.group))
  for (const [group, strain] of body.strains.entries()) {
    if (!used.has(group)) continue
    const percent = (100 * strain).toFixed(1)
    const degrees = (360 * genome.phase[group]!).toFixed(0)
    lines.push(`Group ${group + 1}: length +-${percent} %, ${degrees} degrees ahead.`)
  }
  return lines
}

function memberLine({ place, a, b, kind, group, lengthM, stiffnessNpm, massKg }: Member): string {
  const ends = `${nodeName(a)} to ${nodeName(b)}`
  const drive = group < 0 ? '' : `, group ${group + 1}`
  const stiffness = `${stiffnessNpm.toFixed(0)} N/m`
  return `${place} ${ends}: ${materials[kind]}${drive}, ${mm(lengthM)}, ${stiffness}, ${grams(massKg)}.`
}

function nodeName(node: number): string {
  return `${node % 2 === 0 ? 'lower' : 'upper'} ${(node >> 1) + 1}`
}

/** Beyond what follows from its use (making.ts). */
export function cautionsOf(genome: CrawlerGenome): readonly Caution[] {
  const { massKg } = buildBody(genome)
  return [
    {
      hazard: 'The model ends here',
      because: 'it is a plane model without buckling, wear, water, roof or hoses',
      consult: 'bench trials behind a guard, and a person licensed for such machines where it will be used',
    },
    {
      hazard: 'Lost machine',
      because: `${grams(massKg)} of rubber and metal, with a lithium cell, may not come back`,
      consult: 'the operator of the culvert, before it goes in; a recovery line of known strength',
    },
  ]
}
