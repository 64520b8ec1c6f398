// Makes a freshly varied genome one that can be put up: a crank that turns all the way round, and a first pose that is
// clear of screen and deck. Pure and idempotent.

import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import { layoutOf, type RakeGenome } from './genome.js'
import { buildMachine } from './machine.js'
import { numbers } from './numbers.js'
import { plates } from './screen.js'

const crankLeastM = 0.1
const spareM = 0.05

/** All that repair does. Genes that the layout does not use are left alone. */
export function repairRake(genome: RakeGenome): RakeGenome {
  return withClearStart(layoutOf(genome) === 'crank' ? withWholeTurns(genome) : genome)
}

/**
 * The crank is the shortest bar, and crank and longest bar are together no longer than the other two (Grashof's rule,
 * with 5 cm to spare). The crank is shortened, then the longest bar.
 */
function withWholeTurns(genome: RakeGenome): RakeGenome {
  const [coupler, rocker, pin] = [genome.links[0]!, genome.rocker[0]!, genome.rockerPin[0]!]
  const [short, middle, long] = [coupler, rocker, pin].sort((a, b) => a - b) as [number, number, number]
  const crankMostM = Math.min(short - spareM, short + middle - long - spareM)
  if (crankMostM >= crankLeastM) {
    return { ...genome, crank: Float64Array.of(Math.min(genome.crank[0]!, crankMostM)) }
  }
  const longestM = short + middle - crankLeastM - spareM
  const cut = (value: number) => Math.min(value, longestM)
  return {
    ...genome,
    crank: Float64Array.of(crankLeastM),
    links: Float64Array.of(cut(coupler), genome.links[1]!),
    rocker: Float64Array.of(cut(rocker)),
    rockerPin: Float64Array.of(cut(pin)),
  }
}

/** The base pin moved up, back or both, by as little as 5 cm at a time, until the parked machine is clear. */
function withClearStart(genome: RakeGenome): RakeGenome {
  if (beginsClear(genome)) return genome
  const [x, y] = [genome.baseX[0]!, genome.baseY[0]!]
  for (let k = 1; k <= 20; k++) {
    for (const [back, up] of [
      [0, k],
      [k, 0],
      [k, k],
    ] as const) {
      const [baseX, baseY] = [x + 0.05 * back, y + 0.05 * up]
      if (baseX > numbers.baseHighM[0] || baseY > numbers.baseHighM[1]) continue
      const moved = { ...genome, baseX: Float64Array.of(baseX), baseY: Float64Array.of(baseY) }
      if (beginsClear(moved)) return moved
    }
  }
  return genome
}

type Place = readonly [number, number]
interface Line {
  readonly from: Place
  readonly to: Place
}

/** Whether no part of the machine touches screen or deck at the first pose; tines may reach between the bars. */
export function beginsClear(genome: RakeGenome): boolean {
  const { bodies, outlines } = buildMachine(genome)
  const at = new Map(bodies.map(({ name, positionM, turn }) => [name, { positionM, turn: turn as number }]))
  return outlines.every(({ body, label, from, to, radiusM }) => {
    const { positionM, turn } = at.get(body)!
    const [c, s] = [cos(turn), sin(turn)]
    const place = ([x, y]: Place): Place => [positionM[0]! + c * x - s * y, positionM[1]! + s * x + c * y]
    const line = { from: place(from), to: place(to) }
    return plates.every(
      (plate) => (label === 'comb' && plate.layer === 'bars') || apartM(line, plate) > radiusM + plate.halfM,
    )
  })
}

/** Distance of two straight pieces: 0 where they cross, else that of the nearest end. */
function apartM(a: Line, b: Line): number {
  const side = ({ from, to }: Line, p: Place) =>
    (to[0] - from[0]) * (p[1] - from[1]) - (to[1] - from[1]) * (p[0] - from[0])
  const crosses = side(a, b.from) * side(a, b.to) < 0 && side(b, a.from) * side(b, a.to) < 0
  if (crosses) return 0
  return Math.min(toLineM(a.from, b), toLineM(a.to, b), toLineM(b.from, a), toLineM(b.to, a))
}

function toLineM(p: Place, { from, to }: Line): number {
  const [dx, dy] = [to[0] - from[0], to[1] - from[1]]
  const length2 = dx * dx + dy * dy
  const along = length2 === 0 ? 0 : ((p[0] - from[0]) * dx + (p[1] - from[1]) * dy) / length2
  const t = Math.min(1, Math.max(0, along))
  const [x, y] = [p[0] - from[0] - t * dx, p[1] - from[1] - t * dy]
  return Math.sqrt(x * x + y * y)
}
