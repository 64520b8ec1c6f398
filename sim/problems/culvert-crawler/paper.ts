// What a person is told of a crawler: its parts with units, and the cautions that leave with it. Cautions are rows
// keyed to this machine's own numbers. A simulation is no certificate, and a machine found by a search works at
// the edge of its model.

import type { Caution } from '../../../shared/problem.js'
import { type Body, buildBody, type Member } from './body.js'
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

interface CautionRow {
  readonly hazard: string
  readonly applies: (body: Body) => boolean
  readonly because: (body: Body) => string
  readonly consult: string
}

const actuatorsOf = (body: Body) => body.members.length - body.passiveCount

const cautionRows: readonly CautionRow[] = [
  {
    hazard: 'The model ends here',
    applies: () => true,
    because: () =>
      'this machine was found by a search and works at the edge of a plane model without buckling, wear, water or fatigue',
    consult: 'bench trials behind a guard, and a person licensed for such machines where it will be used',
  },
  {
    hazard: 'Compressed air',
    applies: (body) => actuatorsOf(body) > 0,
    because: (body) =>
      `${actuatorsOf(body)} bellows work at up to ${(numbers.pressurePa / 1000).toFixed(0)} kPa gauge; a bellows, hose ` +
      'or fitting that lets go can strike or throw parts',
    consult:
      "local pressure-equipment rules, the makers' data sheets of bellows, hoses and valves; relief valve and eye protection",
  },
  {
    hazard: 'Pinching',
    applies: (body) => actuatorsOf(body) > 0,
    because: (body) =>
      `struts push and pull with up to ${(numbers.pressurePa * numbers.boreAreaM2).toFixed(1)} N each, several at ` +
      `once, ${body.frequencyHz.toFixed(1)} times a second, and bays close between their nodes`,
    consult: 'local machine-safety rules; shut off and vent before touching',
  },
  {
    hazard: 'Confined space',
    applies: () => true,
    because: () =>
      'culverts and pipes can hold too little oxygen, poisonous or burnable gas, and sudden water',
    consult:
      'local confined-space rules and an entry permit; place and fetch the machine from outside, with a line tied to it',
  },
  {
    hazard: 'Electricity near water',
    applies: () => true,
    because: () => 'the puck and any valves on board or at the portal are powered in a wet place',
    consult:
      "local electrical codes, a licensed electrician, and the makers' data sheets; extra-low voltage and sealed housings",
  },
  {
    hazard: 'Lost machine',
    applies: () => true,
    because: (body) =>
      `${(body.massKg * 1000).toFixed(0)} g of rubber and metal left in a culvert can block a screen or reach a pump`,
    consult: 'the operator of the culvert; a recovery line of known strength',
  },
  {
    hazard: 'Drinking water',
    applies: () => true,
    because: () => 'rubbers, pads and lubricants touch what flows through the pipe',
    consult: "local rules for materials in contact with drinking water, and the makers' approvals",
  },
]

/** The cautions that apply to this machine, with its own numbers. */
export function cautionsOf(genome: CrawlerGenome): readonly Caution[] {
  const body = buildBody(genome)
  return cautionRows
    .filter((row) => row.applies(body))
    .map(({ hazard, because, consult }) => ({ hazard, because: because(body), consult }))
}
