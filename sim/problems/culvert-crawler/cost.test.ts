// The cost that a search counts with is the cost of the machine that is simulated.

import { describe, expect, test } from 'vitest'
import { randomGenome } from '../../../shared/encodings.js'
import { stream } from '../../../shared/streams.js'
import { stepBound } from '../../lattice/stability.js'
import { buildBody } from './body.js'
import { crawlerCost, sumUp } from './cost.js'
import { culvert, slopeMost } from './floor.js'
import type { CrawlerGenome } from './genome.js'
import problem from './index.js'
import { costOf } from './measure.js'
import { describeMachine } from './trial.js'

const drawn = Array.from({ length: 1500 }, (_, number) => {
  return randomGenome(problem.genome, stream(20_261_201, 'founder', 7, number)) as CrawlerGenome
})
const founders = drawn.map((genome) => problem.repair(genome))

/** Every real number at one end of its range. */
function atTheEnd(genome: CrawlerGenome, end: 'low' | 'high'): CrawlerGenome {
  const parts = Object.entries(problem.genome).map(([part, encoding]) => {
    const value = genome[part as keyof CrawlerGenome]
    return [part, encoding.kind === 'real' ? value.map(() => encoding[end]) : value]
  })
  return Object.fromEntries(parts) as CrawlerGenome
}

const kinds: readonly (readonly [string, readonly CrawlerGenome[]])[] = [
  ['repaired', founders],
  ['not repaired', drawn],
  ['as short and low as can be', founders.slice(0, 300).map((genome) => atTheEnd(genome, 'low'))],
  ['as long and high as can be', founders.slice(0, 300).map((genome) => atTheEnd(genome, 'high'))],
]

describe.each(kinds)('genomes drawn at random, %s', (_, genomes) => {
  test('have the expected cost of their body, whatever was asked before', () => {
    const costs = genomes.map((genome) => crawlerCost(genome, slopeMost))
    expect(costs).toEqual(genomes.map((genome) => costOf(buildBody(genome), culvert)))
    expect(genomes.map((genome) => problem.expectedCost(genome))).toEqual(costs)
  })

  test('have the struts, the nodes and, to the last bit, the bound of the step of their body', () => {
    for (const genome of genomes) {
      const body = buildBody(genome)
      const { node: _node, ...bound } = stepBound(describeMachine(body, culvert.steepest))
      const { members, positionsM } = body
      expect(sumUp(genome, slopeMost)).toEqual({ struts: members.length, nodes: positionsM.length, bound })
    }
  })
})

test('costs differ between genomes, so that comparing them says something', () => {
  expect(new Set(founders.map((genome) => crawlerCost(genome, slopeMost))).size).toBeGreaterThan(30)
})
