// Who speaks for a simulation, and who is to be asked next: with several machines each is one voter, and the next one
// is a machine that has not spoken, of the class that is in doubt; when all have spoken, each once more in another
// process, to tell whether it repeats itself.

import { agree, ruleOf } from '../../shared/exactness.js'
import type { ProblemPlan } from '../evolution/plan.js'
import { processOf, type Trust, type Where } from './trust.js'
import type { Reading } from './votes.js'
import type { Work } from './works.js'

/** Machines vote where there are several, or where several have voted: one must not outvote another by processes. */
function votesByHost({ votes }: Work, trust: Trust): boolean {
  const first = votes[0]?.executor.host
  return trust.byHost || (trust.known && votes.some(({ executor }) => executor.host !== first))
}

/** How the votes on this work are read, with the machines there are now. */
export function readingOf(work: Work, trust: Trust, problem: ProblemPlan): Reading {
  const byHost = votesByHost(work, trust)
  const { convicts } = ruleOf(problem)
  return {
    voterOf: (by) => (byHost ? by.host : processOf(by.worker)),
    // Where chance differs as well, classes tell nothing.
    classOf: (by) => (convicts ? trust.classOf(by) : ''),
    counts: (by) => trust.accepts(by),
    agree: (a, b) => agree(problem, a, b),
    hasOthers: (hosts, processor) => trust.elsewhere(hosts, processor),
  }
}

/** Where another simulation of this work tells most; undefined when nobody left can tell anything. */
export function whereNext(work: Work, trust: Trust): Where | undefined {
  const workers = work.votes.map(({ executor }) => executor.worker)
  if (!votesByHost(work, trust)) return trust.elsewhereThan(workers, [])
  const hosts = new Set(work.votes.map(({ executor }) => executor.host))
  for (const processor of work.disputed ? work.onProcessors : []) {
    if (trust.elsewhere(hosts, processor)) return trust.elsewhereThan(workers, [...hosts], processor)
  }
  if (trust.elsewhere(hosts)) return trust.elsewhereThan(workers, [...hosts])
  const again = trust.usable.find(({ host }) => processesOf(work, host) < 2)
  if (!again) return undefined
  const others = trust.usable.filter((one) => one !== again).map(({ host }) => host)
  return trust.elsewhereThan(workers, others)
}

/** How many processes of a machine have simulated it. */
function processesOf({ votes }: Work, host: string): number {
  const own = votes.filter(({ executor }) => executor.host === host)
  return new Set(own.map(({ executor }) => processOf(executor.worker))).size
}
