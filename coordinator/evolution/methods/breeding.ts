// From parents to a birth, the same for every method: crossing with a chance, then mutation with a chance. Every
// draw comes from the birth's own stream, in a fixed order: first parent, whether to cross, second parent,
// crossover, whether to mutate, mutation.

import type { Stream } from '../../../shared/streams.js'
import { numberSetting } from '../settings.js'
import type { Birth, Individual, MethodContext, SettingTable, Variation } from '../types.js'

export interface BreedingRules {
  readonly variation: Variation
  readonly crossoverChance: number
  readonly mutationChance: number
}

/** The setting rows of every method that breeds; a method spreads these into its own table. */
export function breedingSettings(crossoverChance: number) {
  return {
    crossoverChance: {
      kind: 'number',
      default: crossoverChance,
      low: 0,
      high: 1,
      help: 'share of children made by crossing two parents; the others come from one parent',
    },
    mutationChance: {
      kind: 'number',
      default: 1,
      low: 0,
      high: 1,
      help: 'share of children that are mutated; how strongly is set by the operators',
    },
  } as const satisfies SettingTable
}

export function breedingRules(context: MethodContext): BreedingRules {
  return {
    variation: context.variation,
    crossoverChance: numberSetting(context.settings, 'crossoverChance'),
    mutationChance: numberSetting(context.settings, 'mutationChance'),
  }
}

export function founderBirth(variation: Variation, stream: Stream): Birth {
  return { genome: variation.founder(stream), parents: [], origin: 'founder', age: 0 }
}

/**
 * One child. `draw` gives the index of a parent among `members`, never `except` (-1: nobody is left out), so that
 * nobody is crossed with itself. The child inherits the age of the older parent.
 */
export function breed(
  rules: BreedingRules,
  members: readonly Individual[],
  draw: (stream: Stream, except: number) => number,
  stream: Stream,
): Birth {
  const first = draw(stream, -1)
  const parent = members[first]!
  const crosses = stream.uniform() < rules.crossoverChance && members.length > 1
  const mate = crosses ? members[draw(stream, first)]! : undefined
  const crossed = mate ? rules.variation.cross(parent.genome, mate.genome, stream) : parent.genome
  const mutates = stream.uniform() < rules.mutationChance
  const genome = mutates ? rules.variation.mutate(crossed, stream) : crossed
  return {
    genome,
    parents: mate ? [parent.id, mate.id] : [parent.id],
    origin: mate ? (mutates ? 'crossed-mutated' : 'crossed') : mutates ? 'mutated' : 'copied',
    age: mate ? Math.max(parent.age, mate.age) : parent.age,
  }
}
