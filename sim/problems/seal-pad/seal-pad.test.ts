// Promises of the seal pad: castable and planar cells, the published honeycomb when given its topology, honest failures.
// That a search finds auxetic pads: search.test.ts beside this file.

import { describe, expect, test } from 'vitest'
import { conditionStream } from '../../../shared/conditions.js'
import { checkGenome, genomesEqual, randomGenome } from '../../../shared/encodings.js'
import { stream } from '../../../shared/streams.js'
import { buildFramework, homogenise, moduliOf, squeeze } from '../../frames/index.js'
import { cellOf, idleSlots, pieceOf } from './cell.js'
import { braceKinds, chord, type PadGenome, padGenome, quarterNodes, quarterWalls } from './genome.js'
import problem, { missOf, sealPad } from './index.js'
import { numbers } from './numbers.js'
import { repairPad } from './repair.js'
import { describeCell, drawCasting, perfectCasting, smallStrain, tryPad } from './trial.js'

function founder(number: number): PadGenome {
  return repairPad(randomGenome(padGenome, stream(20_261_201, 'founder', 1, number)) as PadGenome)
}
const casting = (replicate: number) => drawCasting(conditionStream(20_261_201, true, 1, replicate))

/**
 * The quarter of a honeycomb: walls 1-4 (half an upright wall), 4-5-6 (a slanting one), 6-9. `slant` in degrees; the
 * wall length follows from the width of the quarter, l cos(slant); upright walls are `upright` times as long.
 */
function honeycomb(slant: number, upright: number, thickness: number): PadGenome {
  const angle = (slant * Math.PI) / 180
  const l = numbers.quarterWidthM / Math.cos(angle)
  const height = l * (upright + Math.sin(angle))
  const left = (upright * l) / 2 / height
  const walls = new Int32Array(12)
  // Grid lines 2, 3: the middle row; 6: lower half of the left side; 11: upper half of the right side.
  for (const slot of [2, 3, 6, 11]) walls[slot] = thickness
  return {
    rubber: Int32Array.of(1),
    height: Float64Array.of(height),
    sides: Float64Array.of(0.5, 0.5, left, 1 - left),
    centre: Float64Array.of(0.5, 0.5),
    walls,
    braces: new Int32Array(4),
    braceWalls: new Int32Array(4),
  }
}

describe('the genome', () => {
  test('repair leaves a genome that fits, and is idempotent', () => {
    for (let i = 0; i < 300; i++) {
      const genome = founder(i)
      expect(checkGenome(padGenome, genome)).toBeUndefined()
      expect(genomesEqual(padGenome, repairPad(genome), genome)).toBe(true)
    }
  })

  test('no two walls of a repaired quarter cross', () => {
    const side = (a: readonly number[], b: readonly number[], p: readonly number[]) =>
      Math.sign((b[0]! - a[0]!) * (p[1]! - a[1]!) - (b[1]! - a[1]!) * (p[0]! - a[0]!))
    let pairs = 0
    for (let i = 0; i < 300; i++) {
      const genome = founder(i)
      const nodes = quarterNodes(genome)
      const walls = quarterWalls(genome)
      for (const [k, w] of walls.entries()) {
        for (const v of walls.slice(k + 1)) {
          if ([v.a, v.b].some((node) => node === w.a || node === w.b)) continue
          const [a, b, c, d] = [nodes[w.a]!, nodes[w.b]!, nodes[v.a]!, nodes[v.b]!]
          pairs++
          expect(side(a, b, c) * side(a, b, d) < 0 && side(c, d, a) * side(c, d, b) < 0).toBe(false)
        }
      }
    }
    expect(pairs).toBeGreaterThan(3_000)
  })

  test('a chord that would cut through the walls of the centre becomes a spoke', () => {
    const genome = {
      ...founder(3),
      sides: Float64Array.of(0.8, 0.5, 0.8, 0.5),
      centre: Float64Array.of(0.25, 0.25),
    }
    const repaired = repairPad({
      ...genome,
      walls: genome.walls.fill(1),
      braces: Int32Array.of(chord, 0, 0, chord),
    })
    expect(braceKinds[repaired.braces[0]!]).toBe('spoke')
    expect(braceKinds[repaired.braces[3]!]).toBe('chord')
  })

  test('walls with a free end are left out, walls that meet their mirror image stay', () => {
    const loose = honeycomb(-30, 1.8, 1)
    loose.walls[0] = 3
    expect(repairPad(loose).walls[0]).toBe(0)
    const bar = honeycomb(-30, 1.8, 1)
    bar.walls[0] = 3
    bar.walls[1] = 3
    expect(Array.from(repairPad(bar).walls.subarray(0, 2))).toEqual([3, 3])
  })

  test('a piece that hangs on nothing is left out', () => {
    // A square grid along the right and upper sides; a diamond of chords round the lower left corner touches nothing.
    const genome = honeycomb(-30, 1.8, 1)
    genome.walls.fill(0)
    for (const slot of [4, 5, 10, 11]) genome.walls[slot] = 2
    genome.braces[0] = chord
    const repaired = repairPad(genome)
    expect(repaired.braces[0]).toBe(0)
    const walls = cellOf(repaired).walls
    expect(walls.length).toBe(8)
    expect(idleSlots(walls).size).toBe(0)
    expect(pieceOf(walls, walls[0]!.a).reach).toBe(2)
  })

  test('the cell has mirror symmetry: stretch and shear are not coupled', () => {
    for (let i = 0; i < 30; i++) {
      const genome = founder(i)
      const small = smallStrain(genome, perfectCasting)
      if ('reason' in small) continue
      const { stiffness } = homogenise(small.described.spec)
      expect(Math.abs(stiffness.c16) + Math.abs(stiffness.c26)).toBeLessThan(1e-9 * stiffness.c11)
    }
  })
})

describe('given the topology of a honeycomb', () => {
  // L. J. Gibson and M. F. Ashby, Cellular Solids, 1997, ch. 4 (from memory), with stretching of the walls, which is
  // exact for Euler-Bernoulli frames; recomputed independently of this code.
  test.each([
    [-30, 2],
    [-10, 2],
    [-20, 1.5],
    [30, 1],
    [45, 1],
  ])(
    'slant %d degrees, upright walls %d times as long: the published moduli and ratios to 1e-10',
    (slant, h) => {
      const genome = honeycomb(slant, h, 1)
      const { spec } = describeCell(genome, perfectCasting, { rigidInShear: true })
      const found = moduliOf(homogenise(spec).stiffness)
      const angle = (slant * Math.PI) / 180
      const [s, c] = [Math.sin(angle), Math.cos(angle)]
      const r = (numbers.wallsM.thin * c) / numbers.quarterWidthM
      const { youngPa, poissonRatio: nu } = numbers.rubbers[1]!
      const young = youngPa / (1 - nu * nu)
      const e1 = (young * r ** 3 * c) / ((h + s) * s * s) / (1 + (c / s) ** 2 * r * r)
      const e2 = (young * r ** 3 * (h + s)) / c ** 3 / (1 + ((s / c) ** 2 + (2 * h) / (c * c)) * r * r)
      const nu12 = ((c * c) / ((h + s) * s)) * ((1 - r * r) / (1 + (c / s) ** 2 * r * r))
      expect(Math.abs(found.e1 / e1 - 1)).toBeLessThan(1e-10)
      expect(Math.abs(found.e2 / e2 - 1)).toBeLessThan(1e-10)
      expect(Math.abs(found.nu12 / nu12 - 1)).toBeLessThan(1e-10)
      expect(Math.abs(found.nu21 / ((nu12 * e2) / e1) - 1)).toBeLessThan(1e-10)
    },
  )

  test('a castable re-entrant pad simulates as auxetic, small strain and working squeeze', () => {
    const genome = problem.repair(honeycomb(-20, 1.5, 2))
    expect(genomesEqual(padGenome, genome, honeycomb(-20, 1.5, 2))).toBe(true)
    for (let i = 0; i < 4; i++) {
      const outcome = problem.simulate(genome, [{ condition: casting(i), case: '' }])[0]!
      if ('failed' in outcome) throw new Error(outcome.failed)
      expect(outcome.measures!.poisson!).toBeLessThan(-0.3)
      expect(outcome.measures!.poissonAtStrain!).toBeLessThan(-0.2)
    }
  })
})

describe('a trial', () => {
  test('is repeatable to the bit and finite over random castings', () => {
    let passed = 0
    for (let i = 0; i < 20; i++) {
      const genome = founder(i)
      const situations = [{ condition: casting(i), case: '' }]
      const first = problem.simulate(genome, situations)
      expect(problem.simulate(genome, situations)).toEqual(first)
      for (const outcome of first) {
        if ('failed' in outcome) continue
        passed++
        for (const value of Object.values({ ...outcome.objectives, ...outcome.measures })) {
          expect(Number.isFinite(value)).toBe(true)
        }
      }
    }
    expect(passed).toBeGreaterThan(5)
  })

  test('walls that hold together one way only are a failure that says so', () => {
    const genome = honeycomb(-30, 1.8, 1)
    genome.walls.fill(0)
    for (const slot of [6, 7]) genome.walls[slot] = 2
    expect(tryPad(genome, perfectCasting)).toEqual({
      reason: 'the pad falls apart: its walls do not hold together both ways',
    })
  })

  test('castings differ: the spread of the stiffness is that of thickness and rubber', () => {
    const moduli = Array.from({ length: 200 }, (_, i) => {
      const small = smallStrain(honeycomb(-20, 1.5, 2), casting(i))
      if ('reason' in small) throw new Error(small.reason)
      return Math.log(small.moduli.e2)
    })
    const mean = moduli.reduce((a, b) => a + b) / moduli.length
    const sd = Math.sqrt(moduli.reduce((a, b) => a + (b - mean) * (b - mean), 0) / (moduli.length - 1))
    // Batch 10 %, walls 3 x 3.3 % averaged over the four slanting walls of the cell.
    expect(sd).toBeGreaterThan(0.08)
    expect(sd).toBeLessThan(0.16)
  })

  test('four and eight pieces a wall converge: two are within 1 % at the working squeeze', () => {
    const genome = honeycomb(-20, 1.5, 2)
    const at = (finer: number) => {
      const trial = tryPad(genome, casting(1), finer)
      if ('reason' in trial) throw new Error(trial.reason)
      return -trial.squeezed.across / trial.squeezed.along
    }
    const [two, four, eight] = [at(1), at(2), at(4)]
    expect(Math.abs(four - eight)).toBeLessThan(Math.abs(two - eight) / 3)
    expect(Math.abs(two / eight - 1)).toBeLessThan(0.01)
  })

  test('a small squeeze gives the ratio of small strain, the working squeeze another', () => {
    const small = smallStrain(honeycomb(-20, 1.5, 2), perfectCasting)
    if ('reason' in small) throw new Error(small.reason)
    const at = (strain: number) => {
      const end = squeeze(buildFramework(small.described.spec), { axis: 1, strain: -strain, steps: 2 })
      return 'reason' in end ? Number.NaN : -end.across / end.along
    }
    const miss = (strain: number) => Math.abs(at(strain) - small.moduli.nu21)
    expect(miss(1e-5)).toBeLessThan(1e-4)
    expect(miss(1e-4) / miss(1e-5)).toBeCloseTo(10, 0)
    expect(miss(numbers.workingSqueeze)).toBeGreaterThan(0.01)
  })

  test('other wishes move the objectives and nothing else', () => {
    const genome = honeycomb(-20, 1.5, 2)
    const situations = [{ condition: casting(0), case: '' }]
    const [a] = problem.simulate(genome, situations)
    const [b] = sealPad({ poisson: 0, modulusPa: 1e5 }).simulate(genome, situations)
    if (!a || !b || 'failed' in a || 'failed' in b) throw new Error('expected results')
    expect(b.measures).toEqual(a.measures)
    expect(b.objectives.miss).not.toBe(a.objectives.miss)
  })

  test('the miss is 0 at the wanted pair, 1 at a tolerance of either number, the same above as below', () => {
    const { wanted, tolerance } = numbers
    const { poisson, modulusPa } = wanted
    expect(missOf(wanted, poisson, modulusPa)).toBe(0)
    for (const sign of [-1, 1]) {
      expect(missOf(wanted, poisson + sign * tolerance.poisson, modulusPa)).toBeCloseTo(1, 9)
      expect(missOf(wanted, poisson, modulusPa * Math.exp(sign * tolerance.logModulus))).toBeCloseTo(1, 9)
    }
    const both = missOf(wanted, poisson + 0.3, modulusPa * Math.E)
    expect(both).toBeCloseTo(5, 9)
    // Pushes back not at all, or the wrong way.
    for (const modulus of [0, -1e4]) expect(Number.isFinite(missOf(wanted, poisson, modulus))).toBe(true)
  })

  test('a pad counts by the worse of first touch and seated', () => {
    const genome = honeycomb(-20, 1.5, 2)
    const [outcome] = problem.simulate(genome, [{ condition: casting(0), case: '' }])
    if (!outcome || 'failed' in outcome) throw new Error('expected results')
    const { poisson, poissonAtStrain, modulus, modulusAtStrain } = outcome.measures!
    const [first, seated] = [
      missOf(numbers.wanted, poisson!, modulus!),
      missOf(numbers.wanted, poissonAtStrain!, modulusAtStrain!),
    ]
    expect(first).not.toBe(seated)
    expect(outcome.objectives.miss).toBe(Math.max(first, seated))
  })

  test('the wanted pair is what the pads are for: both ends clear a slot, and four pads carry the lid, at the working squeeze', () => {
    const { need, padM, wanted, workingSqueeze } = numbers
    const drawnInM = -wanted.poisson * workingSqueeze * padM.length
    expect(drawnInM / 2).toBeCloseTo(need.slotM, 12)
    const carriedN = need.padsUnderLid * wanted.modulusPa * workingSqueeze * padM.length * padM.depth
    expect(carriedN / (need.lidKg * need.gravityMps2)).toBeCloseTo(1, 12)
  })
})

describe('what a person sees', () => {
  test('the replay squeezes a block of cells between plates by the working squeeze', () => {
    const frames = problem.frames!(honeycomb(-20, 1.5, 2), { condition: casting(0), case: '' })
    const count = frames.nodeRadiiM.length
    expect(frames.positions.length).toBe(numbers.frameCount)
    for (const frame of frames.positions) expect(frame.length).toBe(2 * count)
    const [first, last] = [frames.positions[0]!, frames.positions.at(-1)!]
    const heightM = (frame: Float64Array) => frame[2 * count - 1]!
    expect(heightM(last) / heightM(first)).toBeCloseTo(1 - numbers.workingSqueeze, 9)
    // An auxetic block narrows halfway up (its ends are spread by the plates).
    const widthM = (frame: Float64Array) => {
      const nodes = Array.from({ length: count - 2 }, (_, i) => [frame[2 * i]!, frame[2 * i + 1]!] as const)
      const xs = nodes.filter(([, y]) => Math.abs(y / heightM(frame) - 0.5) < 0.2).map(([x]) => x)
      return Math.max(...xs) - Math.min(...xs)
    }
    expect(widthM(last)).toBeLessThan(widthM(first))
  })

  test('every founder can be shown, described and cautioned about', () => {
    for (let i = 0; i < 6; i++) {
      const genome = founder(i)
      const frames = problem.frames!(genome, { condition: casting(0), case: '' })
      expect(frames.positions.length).toBeGreaterThan(0)
      expect(frames.positions.every((frame) => frame.every(Number.isFinite))).toBe(true)
      expect(problem.describe!(genome).join('\n')).toMatch(/As drawn/)
      expect(problem.cautions!(genome).length).toBeGreaterThan(0)
    }
  })
})
