// Statistics of an island's population as people read them.

import { islandOf } from '../../../shared/ids.js'
import { diversityOf, quantiles } from '../../evolution/diversity.js'
import { naturalValue } from '../../evolution/estimate.js'
import type { Island } from '../../evolution/island.js'
import type { SearchPlan } from '../../evolution/plan.js'
import type { Individual } from '../../evolution/types.js'
import type { PopulationView } from '../progress-view.js'

/** Members looked at for the diversity: the view is made every second. */
const diversityMembers = 48
const quartiles = [0, 0.25, 0.5, 0.75, 1] as const

export function populationView(plan: SearchPlan, island: Island): PopulationView {
  const members = island.members()
  const working = members.filter(({ failedSimulations }) => failedSimulations === 0)
  const sample = evenly(members, diversityMembers).map(({ genome }) => genome)
  const { meanDistance, parts } = diversityOf(plan.problem.spec, sample)
  const ages = agesOf(island, members)
  return {
    members: members.length,
    failed: members.length - working.length,
    objectives: working.length === 0 ? [] : objectivesOf(plan, working),
    diversity: {
      mean: meanDistance,
      parts: Object.fromEntries(Object.entries(parts).map(([part, one]) => [part, one.meanDistance])),
    },
    ...(ages ? { ageCommits: ages } : {}),
  }
}

function objectivesOf(plan: SearchPlan, working: readonly Individual[]): PopulationView['objectives'] {
  return plan.problem.objectives.map((objective, column) => {
    const values = working.map(({ score }) => naturalValue(objective, score[column]!))
    const [least, low, middle, high, greatest] = quantiles(values, quartiles)
    return {
      name: objective.name,
      unit: objective.unit,
      quantiles: [least!, low!, middle!, high!, greatest!],
    }
  })
}

function agesOf(island: Island, members: readonly Individual[]): PopulationView['ageCommits'] {
  const ages = members
    .filter(({ id }) => islandOf(id) === island.number)
    .map(({ bornAtCommit }) => island.counters.commits - bornAtCommit)
  if (ages.length === 0) return undefined
  const [median, oldest] = quantiles(ages, [0.5, 1])
  return { median: median!, oldest: oldest! }
}

function evenly<Item>(items: readonly Item[], most: number): readonly Item[] {
  if (items.length <= most) return items
  return Array.from({ length: most }, (_, at) => items[Math.floor((at * items.length) / most)]!)
}
