// The pump mount as a problem: a lattice of rubber and spring steel that carries a sensor on a vibrating pump. What it
// is and which handbook cases stand behind it: README.md beside this file.

import type { Situation } from '../../../shared/problem.js'
import { defineProblem } from '../../problem.js'
import { buildMount, type Mount } from './body.js'
import { type MountGenome, mountGenome, repairMount } from './genome.js'
import { type CaseName, caseNames, numbers } from './numbers.js'
import { describeMount, mountProcess, partsOfMount, useOfMount } from './paper.js'
import { mountFrames } from './replay.js'
import {
  arriving,
  type Broken,
  drawMount,
  type Loaded,
  load,
  type MountCondition,
  type Recording,
  shake,
  speedIn,
  strutSteps,
  weakness,
  worstTravel,
} from './trial.js'

/** Highest ratio that is kept as a measure. */
const ratioMost = 100

function outcome(
  mount: Mount,
  condition: MountCondition,
  name: CaseName,
  { sagM, slowestHz }: Loaded,
  recording: Recording | Broken,
) {
  if ('reason' in recording) return { failed: recording.reason }
  const worst = worstTravel(mount, recording.tally)
  if (worst.share > 1) {
    const percent = Math.round(100 * worst.share)
    return { failed: `${worst.name} travels ${percent} % of what it bears` }
  }
  const ratio = arriving(recording, speedIn(name, condition), numbers.samplesPerSecond, numbers.shakeM)
  const { peakTensionN } = recording.tally
  return {
    objectives: {
      transmissibility: numbers.weights[name] * ratio,
      sag: sagM,
      material: mount.materialKg,
    },
    measures: {
      ratio: Math.min(ratioMost, ratio),
      slowest: slowestHz,
      travelShare: worst.share,
      peakForce: peakTensionN.subarray(0, mount.members.length).reduce((a, b) => Math.max(a, b), 0),
      struts: mount.members.length,
      joints: mount.sensorNode - 5,
    },
  }
}

function simulated(genome: MountGenome, situations: readonly Situation<MountCondition>[], divide: number) {
  const mount = buildMount(genome)
  const weak = weakness(mount)
  if (weak) return situations.map(() => ({ failed: weak.reason }))
  const outcomes: ReturnType<typeof outcome>[] = []
  for (const group of besideEachOther(situations)) {
    const { condition } = group[0]!
    const names = group.map((situation) => situation.case as CaseName)
    const loaded = load(mount, condition, divide)
    if ('reason' in loaded) {
      outcomes.push(...names.map(() => ({ failed: loaded.reason })))
      continue
    }
    const recordings = shake(
      loaded.shaking,
      names.map((name) => speedIn(name, condition)),
    )
    outcomes.push(...recordings.map((one, i) => outcome(mount, condition, names[i]!, loaded, one)))
  }
  return outcomes
}

/** Runs of situations under the same condition, at most four: the lanes of one kernel. */
function besideEachOther(situations: readonly Situation<MountCondition>[]): Situation<MountCondition>[][] {
  const groups: Situation<MountCondition>[][] = []
  for (const situation of situations) {
    const last = groups.at(-1)
    if (last && last.length < 4 && last[0]!.condition === situation.condition) last.push(situation)
    else groups.push([situation])
  }
  return groups
}

export default defineProblem({
  name: 'pump-mount',
  version: '1',
  summary:
    'A lattice of rubber and spring steel carries a sensor on a pump and keeps the pump’s shaking from it.',
  genome: mountGenome,
  objectives: {
    transmissibility: { direction: 'minimise', unit: '1', overCases: 'sum' },
    sag: { direction: 'minimise', unit: 'm', overCases: 'mean' },
    material: { direction: 'minimise', unit: 'kg', overCases: 'mean' },
  },
  measures: {
    ratio: { low: 0, high: ratioMost, unit: '1' },
    slowest: { low: 0, high: 100, unit: 'Hz' },
    travelShare: { low: 0, high: 1, unit: '1' },
    peakForce: { low: 0, high: 200, unit: 'N' },
    struts: { low: 4, high: 47, unit: '1' },
    joints: { low: 4, high: 15, unit: '1' },
  },
  cases: caseNames,
  drawCondition: drawMount,
  simulate: (genome, situations) => simulated(genome, situations, 1),
  simulateFiner: simulated,
  // In units of 200,000 strut steps.
  expectedCost: (genome) => Math.max(1, Math.round(strutSteps(buildMount(genome)) / 200_000)),
  repair: repairMount,
  frames: (genome, { condition, case: name }) => mountFrames(buildMount(genome), condition, name as CaseName),
  describe: describeMount,
  process: mountProcess,
  parts: partsOfMount,
  use: useOfMount,
})
