// The pump mount as a problem: a lattice of rubber and spring steel that carries a sensor on a vibrating pump. What it
// is and which handbook cases stand behind it: README.md beside this file.

import type { FailedSimulation, SimulationOutcome, Situation } from '../../../shared/problem.js'
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
  farthestM,
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
/** Most room that is kept as a measure, m. */
const roomMostM = 0.02

/** All that one simulation says of a mount. */
interface Judged {
  readonly aims: { readonly transmissibility: number; readonly sag: number; readonly material: number }
  readonly measures: { readonly [name: string]: number }
}

function outcome(
  mount: Mount,
  condition: MountCondition,
  name: CaseName,
  { sagM, slowestHz }: Loaded,
  recording: Recording | Broken,
): Judged | FailedSimulation {
  if ('reason' in recording) return { failed: recording.reason }
  const worst = worstTravel(mount, recording.tally)
  if (worst.share > 1) {
    const percent = Math.round(100 * worst.share)
    return { failed: `${worst.name} travels ${percent} % of what it bears` }
  }
  const roomM = sagM + farthestM(recording)
  const lack = Math.max(0, roomM / numbers.roomM - 1)
  const ratio = arriving(recording, speedIn(name, condition), numbers.samplesPerSecond, numbers.shakeM)
  const { peakTensionN } = recording.tally
  const aims = {
    transmissibility: numbers.weights[name] * ratio + numbers.lackWeight * lack,
    sag: sagM,
    material: mount.materialKg,
  }
  return {
    aims,
    measures: {
      ratio: Math.min(ratioMost, ratio),
      room: Math.min(roomMostM, roomM),
      slowest: slowestHz,
      travelShare: worst.share,
      peakForce: peakTensionN.subarray(0, mount.members.length).reduce((a, b) => Math.max(a, b), 0),
      struts: mount.members.length,
      joints: mount.sensorNode - 5,
    },
  }
}

function simulated(
  genome: MountGenome,
  situations: readonly Situation<MountCondition>[],
  divide: number,
): (Judged | FailedSimulation)[] {
  const mount = buildMount(genome)
  const weak = weakness(mount)
  if (weak) return situations.map(() => ({ failed: weak.reason }))
  const outcomes: (Judged | FailedSimulation)[] = []
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

/** What a mount can be judged by. */
const aims = {
  transmissibility: { direction: 'minimise', unit: '1', overCases: 'sum' },
  sag: { direction: 'minimise', unit: 'm', overCases: 'mean' },
  material: { direction: 'minimise', unit: 'kg', overCases: 'mean' },
} as const
const besides = {
  sag: { low: 0, high: roomMostM, unit: 'm' },
  material: { low: 0, high: 1, unit: 'kg' },
} as const

const measures = {
  ratio: { low: 0, high: ratioMost, unit: '1' },
  room: { low: 0, high: roomMostM, unit: 'm' },
  slowest: { low: 0, high: 100, unit: 'Hz' },
  travelShare: { low: 0, high: 1, unit: '1' },
  peakForce: { low: 0, high: 200, unit: 'N' },
  struts: { low: 4, high: 47, unit: '1' },
  joints: { low: 4, high: 15, unit: '1' },
} as const

/**
 * The problem. `within-the-room`: one objective, what arrives, of a mount whose sag and swing are kept in bounds by the room below the
 * sensor; sag and material are measures. `front`: all three are objectives, for methods that keep a whole front.
 */
export function pumpMount(judged: 'within-the-room' | 'front' = 'within-the-room') {
  const isFront = judged === 'front'
  const simulate = (
    genome: MountGenome,
    situations: readonly Situation<MountCondition>[],
    divide: number,
  ): SimulationOutcome[] =>
    simulated(genome, situations, divide).map((one): SimulationOutcome => {
      if ('failed' in one) return one
      const { transmissibility, sag, material } = one.aims
      return isFront
        ? { objectives: one.aims, measures: one.measures }
        : {
            objectives: { transmissibility },
            measures: { sag: Math.min(roomMostM, sag), material, ...one.measures },
          }
    })
  return defineProblem({
    name: 'pump-mount',
    version: '2',
    summary:
      'A lattice of rubber and spring steel carries a sensor on a pump and keeps the pump’s shaking from it.',
    genome: mountGenome,
    objectives: isFront ? aims : { transmissibility: aims.transmissibility },
    measures: isFront ? measures : { ...besides, ...measures },
    cases: caseNames,
    drawCondition: drawMount,
    simulate: (genome, situations) => simulate(genome, situations, 1),
    simulateFiner: simulate,
    // In units of 200,000 strut steps.
    expectedCost: (genome) => Math.max(1, Math.round(strutSteps(buildMount(genome)) / 200_000)),
    repair: repairMount,
    frames: (genome, { condition, case: name }) =>
      mountFrames(buildMount(genome), condition, name as CaseName),
    describe: describeMount,
    process: mountProcess,
    parts: partsOfMount,
    use: useOfMount,
  })
}

export default pumpMount()
