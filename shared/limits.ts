// Everything has a limit, and all limits live here. The relations between them are checked when the file
// loads, so that a changed number cannot quietly break another part.

import { check } from './check.js'
import { firstControl } from './ids.js'

export const limits = {
  // Texts
  /** Characters kept of the reason of a failed simulation. */
  failureReasonLength: 200,
  /** Characters kept of the last words of a worker that died. */
  lossDetailLength: 2_000,
  /** Characters of a name: search, part, objective, measure, case. */
  nameLength: 64,
  /** Characters of an option of a `choice` or `layout`. */
  optionLength: 64,

  // Search file
  searchFileBytes: 2 ** 20,
  searchFileDepth: 32,
  seedMost: 2 ** 53 - 1,
  /** Also the most individuals of an island: their numbers are words of a random stream's counter. */
  simulationsMost: 2 ** 32 - 1,

  // Genome
  partsMost: 1_000,
  /** Numbers in a whole genome. */
  genomeSlots: 100_000,
  optionsMost: 65_536,
  layoutAxes: 3,
  genomeBytes: 2 ** 20,

  // Results
  objectivesMost: 16,
  measuresMost: 64,
  casesMost: 256,
  replicatesMost: 4_096,
  /** Rows of one evaluation: replicates times cases. */
  simulationsPerEvaluation: 65_536,
  /** Numbers in one result. */
  resultValues: 2 ** 20,
  /** Expected costs are positive integers up to this. */
  expectedCostMost: 1e9,

  // Lattice
  latticeNodesMost: 10_000,
  /** Struts, areas, volumes and pairs together. */
  latticePartsMost: 200_000,
  /** Heights of a ground. */
  latticeHeightsMost: 2 ** 20,

  // Search
  islandsMost: 1_000,
  populationMost: 100_000,
  lookaheadMost: 100_000,
  emigrantsMost: 10_000,
  lagMost: 1_000,

  // Dispatch
  /** Times an evaluation may be lost before it runs alone in a process of its own. */
  attemptsBeforeIsolation: 3,
  /** Times it may die alone before it is set aside. */
  attemptsAlone: 2,
  /** Evaluations that travel to a worker together. */
  dispatchBatch: 1_024,
  /** Confirmations of committed evaluations that the engine remembers before it asks the record again. */
  confirmedInMemory: 100_000,
  /** Rows of one kind in one transaction of the record. */
  appendBatch: 8_192,
  /** Bytes of a pinned bundle that an agent takes. */
  pluginBytes: 2 ** 26,
  /** Simulation threads of one machine. */
  threadsMost: 1_024,
  /** Megabytes that one simulation may hold where its problem says nothing, and that it may ask for. */
  megabytesUsual: 1_024,
  megabytesMost: 4_194_304,
  /** Kinds of licences of a problem or a search file, and how many of one kind. */
  tokenKinds: 16,
  tokensMost: 1_000_000,
  /** Wall time that a simulation may take, as a multiple of the expected: a backstop, never the measure. */
  wallTimeFactor: 20,
} as const

for (const [name, value] of Object.entries(limits)) {
  check(Number.isSafeInteger(value) && value > 0, `limit ${name} is a positive integer`)
}
check(limits.emigrantsMost <= limits.populationMost, 'an island can hold as many as it may send')
check(limits.genomeSlots * 8 <= limits.genomeBytes, 'the largest genome of doubles fits its bytes')
check(limits.partsMost <= limits.genomeSlots, 'every part can have a slot')
check(limits.optionsMost <= 2 ** 31 - 1, 'an option index fits a signed 32-bit integer')
check(limits.replicatesMost <= limits.simulationsPerEvaluation, 'replicates without cases fit one evaluation')
check(limits.casesMost <= limits.simulationsPerEvaluation, 'one replicate of all cases fits one evaluation')
check(
  limits.simulationsPerEvaluation <= limits.resultValues,
  'the most simulations fit a result with one objective',
)
check(
  (limits.objectivesMost + limits.measuresMost) * limits.casesMost <= limits.resultValues,
  'a replicate of every case with every column fits a result',
)
check(limits.latticeNodesMost * 9 <= 2 ** 31 - 1, 'offsets of node records fit signed 32-bit integers')
check(limits.dispatchBatch <= limits.appendBatch, 'what returns together can be made durable together')
check(limits.islandsMost < firstControl, 'island numbers stay below those of controls')
check(limits.simulationsMost < 2 ** 32, 'every individual has random streams of its own (streams.ts)')
