// Jobs and answers of the size that a trivial search sends: small genomes, one value each.

import { encodeAnswers, encodeJob } from '../../../shared/cluster/codec.js'
import { type JobHeader, protocolVersion } from '../../../shared/cluster/messages.js'
import { resultDigest } from '../../../shared/digests.js'
import { idOf } from '../../../shared/ids.js'
import type { WorkItem } from '../../../shared/result.js'

export function itemOf(evaluation: number, genomeBytes = 16): WorkItem {
  return {
    island: 1,
    evaluation,
    individual: idOf(1, evaluation),
    firstReplicate: 0,
    replicates: 1,
    genome: Uint8Array.from({ length: genomeBytes }, (_, i) => (evaluation * 31 + i * 7) & 0xff),
    expectedCost: 1,
    attempt: 1,
    purpose: 'evaluate',
    isolation: 'shared',
    avoid: [],
  }
}

const common = { protocol: protocolVersion, search: 'bench', record: 'bench' }

export function jobOf(evaluations: number): Uint8Array {
  const items = Array.from({ length: evaluations }, (_, i) => itemOf(i + 1))
  const header: JobHeader = {
    ...common,
    instance: 'i',
    dispatch: 1,
    purpose: 'evaluate',
    isolation: 'shared',
    avoid: [],
    avoidHosts: [],
  }
  return encodeJob({ header, items })
}

export function answersOf(evaluations: number): Uint8Array {
  const result = { values: Float64Array.of(8), failures: [] }
  const executor = { kind: 'thread', worker: 'host-a/4711/t1', host: 'host-a' } as const
  const answers = Array.from({ length: evaluations }, (_, index) => ({
    dispatch: 1,
    index,
    item: { island: 1, evaluation: index + 1, attempt: 1, purpose: 'evaluate' as const },
    result,
    digest: resultDigest(result),
    executor,
    cpuSeconds: 1e-6,
    wallSeconds: 1e-6,
  }))
  const header = {
    ...common,
    agent: 'host-a-4711-00ff',
    host: 'host-a',
    processor: 'x64',
    pluginDigest: '0'.repeat(64),
    skerry: '0.1.0',
  }
  return encodeAnswers({ header, answers, losses: [] })
}
