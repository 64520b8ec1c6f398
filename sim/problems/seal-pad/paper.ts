// What a person is told of a seal pad: its cell with units, and the cautions that leave with it.

import type { Caution } from '../../../shared/problem.js'
import { cellOf } from './cell.js'
import { gridLines, type PadGenome, quarterNodes, quarterWalls, thicknessOfM, wallKinds } from './genome.js'
import { numbers } from './numbers.js'
import { asDrawn, perfectCasting, smallStrain, tryPad } from './trial.js'

const mm = (metres: number) => `${(metres * 1000).toFixed(2)} mm`
const percent = (share: number) => `${(100 * share).toFixed(1)} %`

/** Lines for a person, part by part, with units. */
export function describePad(genome: PadGenome): readonly string[] {
  const cell = cellOf(genome)
  const { length, height, depth } = numbers.padM
  const lines = [
    `Pad: ${mm(length)} long, ${mm(height)} high, ${mm(depth)} deep, ${numbers.rubbers[genome.rubber[0]!]!.name}.`,
    `Cell: ${mm(cell.widthM)} wide, ${mm(cell.heightM)} high, ${cell.walls.length} walls; four mirrored quarters.`,
  ]
  const nodes = quarterNodes(genome)
  const walls = quarterWalls(genome)
  const used = new Set(walls.flatMap(({ a, b }) => [a, b]))
  for (const [node, [x, y]] of nodes.entries()) {
    if (used.has(node)) lines.push(`Node ${node + 1}: ${mm(x)} along, ${mm(y)} up.`)
  }
  for (const { a, b, kind, slot } of walls) {
    const what = slot < gridLines.length ? 'Wall' : 'Brace'
    lines.push(`${what} ${a + 1} to ${b + 1}: ${wallKinds[kind]}, ${mm(thicknessOfM[kind]!)}.`)
  }
  lines.push(resultLine(genome))
  return lines
}

/** What the model says of a casting without deviations, but for walls that are a little out of line. */
function resultLine(genome: PadGenome): string {
  const small = smallStrain(genome, perfectCasting)
  if ('reason' in small) return `As drawn: ${small.reason}.`
  const begin =
    `As drawn: Poisson's ratio ${small.moduli.nu21.toFixed(3)} and ${(small.moduli.e2 / 1000).toFixed(1)} kPa at small ` +
    `strain, ${(1000 * small.materialKg).toFixed(0)} g`
  const trial = tryPad(genome, asDrawn)
  if ('reason' in trial) return `${begin}; ${trial.reason}.`
  const { squeezed } = trial
  const atStrain = -squeezed.across / squeezed.along
  return (
    `${begin}; Poisson's ratio ${atStrain.toFixed(3)} at ${percent(numbers.workingSqueeze)} squeeze, walls strained ` +
    `up to ${percent(trial.wallStrain)}.`
  )
}

const rows: readonly Caution[] = [
  {
    hazard: 'The model ends here',
    because:
      'this pad was found by a search and is as good as a plane model of beams: no contact between walls, no creep, no ' +
      'ageing, no friction at the plates, all cells alike',
    consult: 'a trial casting, squeezed and measured on the bench before anything depends on it',
  },
  {
    hazard: 'A seal that leaks',
    because:
      'a pad that draws in may lose its contact where an ordinary gasket would press outwards; a hatch that leaks can ' +
      'flood a room or let foul water in',
    consult:
      "the hatch maker's data sheets, a pressure test with water, and the person licensed for the plant",
  },
]

/** The cautions that leave with every pad. */
export function cautionsOf(_genome: PadGenome): readonly Caution[] {
  return rows
}
