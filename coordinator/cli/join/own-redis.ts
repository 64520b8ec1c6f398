// --own-redis: a Redis of this coordinator's own, and the word to workers where it is.

import { hostname } from 'node:os'
import { defaultPrefix } from '../../../shared/cluster/keys.js'
import { protocolVersion } from '../../../shared/cluster/messages.js'
import { hex } from '../../../shared/digests.js'
import { type OwnServer, startOwnServer } from '../../../worker/redis/own-server.js'
import { writeRendezvous } from '../../record/rendezvous.js'
import type { RunEvent } from '../run-options.js'

export interface OwnRedisOptions {
  /** Name or address of this machine for others; its host name unless said. */
  readonly address: string | undefined
  /** Where workers look: the record as people know it. */
  readonly folder: string
  /** The coordinator's hold on the record. */
  readonly holder: number
  /** Workers that are given no key take this one from the record's folder. */
  readonly key: Uint8Array
  readonly tell: (event: RunEvent) => void
}

/** @throws Refusal when redis-server is missing, or the folder cannot be written */
export async function ownRedis(options: OwnRedisOptions): Promise<OwnServer> {
  const say = (sentence: string) => options.tell({ kind: 'said', sentence })
  const server = await startOwnServer({
    address: options.address ?? hostname(),
    bindAddressOnly: options.address !== undefined,
    prefix: defaultPrefix,
    restarted: (why) => say(`Redis ended and was started again, empty: ${why || 'it gave no reason'}`),
    lost: (refusal) => say(refusal.message),
  })
  try {
    writeRendezvous(options.folder, {
      protocol: protocolVersion,
      url: server.workerUrl,
      holder: options.holder,
      host: hostname(),
      pid: process.pid,
      writtenAt: new Date().toISOString(),
      clusterKey: hex(options.key),
    })
  } catch (error) {
    await server.close()
    throw error
  }
  say(`Workers find this search with: skerry work --record ${options.folder}`)
  return server
}
