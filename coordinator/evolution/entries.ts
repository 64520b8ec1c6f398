// The bytes that enter an island's digest, one entry a change. Each opens with its kind, so that no two kinds can
// be mistaken for one another.
//
//   1 commit     commit, evaluation, individual, first replicate, replicates, result digest (32), genome bytes
//   2 receive    epoch, count, then individual, replicates and scores of each arrival
//   3 send       the same for those who left
//   4 amendment  commits, individual, first replicate, result digest (32)

import { ByteWriter } from '../../shared/bytes.js'
import { resultDigest } from '../../shared/digests.js'
import type { Amendment } from './island-state.js'
import type { Ticket } from './tickets.js'
import type { Individual } from './types.js'

const kinds = { commit: 1, receive: 2, send: 3, amendment: 4 } as const
const writer = new ByteWriter(4096)

/** Valid until the next entry is written. */
export function commitEntry(commit: number, ticket: Ticket, resultDigestBytes: Uint8Array): Uint8Array {
  writer
    .reset()
    .u8(kinds.commit)
    .count(commit)
    .count(ticket.evaluation)
    .count(ticket.individual.id)
    .count(ticket.firstReplicate)
    .count(ticket.replicates)
    .bytes(resultDigestBytes)
  // A top-up adds no genome: it stands in the entry of the first block.
  if (ticket.firstReplicate === 0) writer.bytes(ticket.genome)
  return writer.peek()
}

export function receiveEntry(epoch: number, arrivals: readonly Individual[]): Uint8Array {
  return travellers(kinds.receive, epoch, arrivals)
}

export function sendEntry(epoch: number, emigrants: readonly Individual[]): Uint8Array {
  return travellers(kinds.send, epoch, emigrants)
}

function travellers(kind: number, epoch: number, individuals: readonly Individual[]): Uint8Array {
  writer.reset().u8(kind).count(epoch).count(individuals.length)
  for (const { id, replicates, score } of individuals) {
    writer.count(id).count(replicates)
    for (const value of score) writer.double(value)
  }
  return writer.peek()
}

export function amendmentEntry(
  commits: number,
  { individual, firstReplicate, result }: Amendment,
): Uint8Array {
  return writer
    .reset()
    .u8(kinds.amendment)
    .count(commits)
    .count(individual)
    .count(firstReplicate)
    .bytes(resultDigest(result))
    .peek()
}
