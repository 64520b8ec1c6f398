// What a person is told of a crawler: its parts with units, and the cautions that leave with it beyond those that
// follow from its use. A simulation is no certificate, and a machine found by a search works at the edge of its model.

import type { Caution } from '../../../shared/problem.js'
import { buildBody, nodeName } from './body.js'
import type { CrawlerGenome } from './genome.js'
import type { Machine, Member } from './machine.js'
import { numbers } from './numbers.js'

export const mm = (metres: number) => `${(metres * 1000).toFixed(1)} mm`
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
  const columns = body.footNodes.map(({ node, foot }, column) => {
    const [[x], [, heightM]] = [body.positionsM[node]!, body.positionsM[node + 1]!] as [number[], number[]]
    return `Column ${column + 1}: ${mm(-x!)} behind the front, ${mm(heightM!)} high, foot ${foot}.`
  })
  return linesOfMachine(body, columns, nodeName)
}

/** Lines for a person on any crawler: `columns` says how its columns are shaped, `nameOf` what a node is called. */
export function linesOfMachine(
  body: Machine,
  columns: readonly string[],
  nameOf: (node: number) => string,
): string[] {
  const lengthM = -Math.min(...body.positionsM.map(([x]) => x!))
  const puckColumn = Math.floor(body.columns / 2) + 1
  const lines = [
    `Body: ${body.columns - 1} bays, ${mm(lengthM)} long, ${grams(body.massKg)} with the puck ` +
      `(${grams(numbers.puckKg)}), ${grams(body.materialKg)} of material.`,
    `Tubes: ${mm(numbers.strutDiameterM)} mean diameter, ${mm(numbers.strutAreaM2 / Math.PI / numbers.strutDiameterM)} wall.`,
    `Puck: on the upper node of column ${puckColumn}.`,
    ...columns,
    ...body.members.map((member) => memberLine(member, nameOf)),
    `Drive: ${body.frequencyHz.toFixed(3)} Hz for all groups.`,
  ]
  const used = new Set(body.members.map((member) => member.group))
  for (const [group, strain] of body.strains.entries()) {
    if (!used.has(group)) continue
    const percent = (100 * strain).toFixed(1)
    const degrees = (360 * body.phaseTurns[group]!).toFixed(0)
    lines.push(`Group ${group + 1}: length +-${percent} %, ${degrees} degrees ahead.`)
  }
  return lines
}

function memberLine(member: Member, nameOf: (node: number) => string): string {
  const { place, a, b, kind, group, lengthM, stiffnessNpm, massKg } = member
  const ends = `${nameOf(a)} to ${nameOf(b)}`
  const drive = group < 0 ? '' : `, group ${group + 1}`
  const stiffness = `${stiffnessNpm.toFixed(0)} N/m`
  return `${place} ${ends}: ${materials[kind]}${drive}, ${mm(lengthM)}, ${stiffness}, ${grams(massKg)}.`
}

export function cautionsOf(genome: CrawlerGenome): readonly Caution[] {
  return cautionsOfMachine(
    buildBody(genome),
    'it is a plane model without buckling, wear, water, roof or hoses',
  )
}

/** Beyond what follows from its use (making.ts). `model`: what the model leaves out. */
export function cautionsOfMachine({ massKg }: Machine, model: string): readonly Caution[] {
  return [
    {
      hazard: 'The model ends here',
      because: model,
      consult: 'bench trials behind a guard, and a person licensed for such machines where it will be used',
    },
    {
      hazard: 'Lost machine',
      because: `${grams(massKg)} of rubber and metal, with a lithium cell, may not come back`,
      consult: 'the operator of the culvert, before it goes in; a recovery line of known strength',
    },
  ]
}
