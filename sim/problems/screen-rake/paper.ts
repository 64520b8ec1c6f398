// The rake on paper: what it is made of, part by part, its drive table, and the cautions of its own.

import type { Caution } from '../../../shared/problem.js'
import { layoutOf, type RakeGenome, ratioOf } from './genome.js'
import { buildMachine, type Outline } from './machine.js'
import { closingForceN, machineKg } from './making.js'
import { numbers } from './numbers.js'

/** Poses that are told of a cycle. */
const posesPerJoint = 12

const mm = (metres: number) => `${(1000 * metres).toFixed(0)} mm`
const degrees = (radians: number) => `${(radians / numbers.degree).toFixed(0)} degrees`

/** Lines for a person. */
export function describeRake(genome: RakeGenome): readonly string[] {
  const machine = buildMachine(genome)
  const lines = [
    `Screen rake, ${layoutOf(genome)}: ${machine.driven.length} motors, ${machineKg(machine).toFixed(1)} kg that move.`,
    `Base pin: ${mm(genome.baseX[0]!)} behind and ${mm(genome.baseY[0]!)} above the foot of the screen.`,
    ...machine.outlines.filter(({ label }) => label !== 'cross bar').map(outlineLine),
  ]
  for (const [i, { joint, target }] of machine.driven.entries()) {
    const stage = ratioOf(genome, i) === 1 ? 'directly' : `by a chain stage 1:${ratioOf(genome, i)}`
    lines.push(`${joint} motor: ${numbers.motor.name}, ${stage}.`)
    if (layoutOf(genome) === 'crank') continue
    const seconds = Array.from({ length: posesPerJoint }, (_, k) => (k * genome.period[0]!) / posesPerJoint)
    const isSlide = joint === 'slide'
    const places = seconds.map((t) => (isSlide ? mm(target(t)) : degrees(target(t))))
    lines.push(`${joint} poses, ${seconds[1]!.toFixed(2)} s from one to the next: ${places.join(', ')}.`)
  }
  lines.push(`One working cycle: ${genome.period[0]!.toFixed(2)} s.`)
  return lines
}

function outlineLine({ body, label, from, to }: Outline): string {
  const [dx, dy] = [to[0] - from[0], to[1] - from[1]]
  const length = mm(Math.sqrt(dx * dx + dy * dy))
  if (label !== 'comb') return `${label}: tube 40 x 40 x 3 mm, ${length}.`
  return `comb on the ${body}: ${numbers.tineCount} tines of 8 mm rod, a straight piece of ${length}.`
}

/** Beyond those that follow from use and energy. */
export function rakeCautions(genome: RakeGenome): readonly Caution[] {
  const force = closingForceN(genome).toFixed(0)
  return [
    {
      hazard: 'Tines shearing between bars',
      because:
        `tines pass between bars and links close with up to ${force} N, and a timer can start the rake at any time, ` +
        'also with a hand in the screen',
      consult:
        'lock the supply out and block the arm before anybody reaches in; fence, emergency stop within reach, restart only by hand; local machine-safety rules and a person licensed for them',
    },
    {
      hazard: 'The model ends here',
      because:
        'found by a search in a plane model: no weeds that wind round tines, no ice, no wear, no flow round the arm, joints that never bend',
      consult: 'first runs at reduced speed with nobody in reach, then trials with real debris',
    },
  ]
}
