// Where the queue server of a record is, as its coordinator last wrote it into the record's folder. Read again at every
// look, so that agents follow a coordinator that was started again on another node.

import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { protocolVersion } from '../../shared/cluster/messages.js'
import { type Rendezvous, rendezvousFile, rendezvousSchema } from '../../shared/cluster/rendezvous.js'
import { refuse } from '../../shared/refusals.js'
import type { QueueLocation } from './server.js'

/** @throws Refusal 'rendezvous-missing', 'bytes-malformed', 'protocol-mismatch' */
export function readRendezvous(folder: string): Rendezvous {
  const file = join(folder, rendezvousFile)
  let text: string
  try {
    text = readFileSync(file, 'utf8')
  } catch (cause) {
    throw refuse('rendezvous-missing', { detail: `${file} is not there`, where: { file }, cause })
  }
  const parsed = rendezvousSchema.safeParse(parseJson(text))
  if (!parsed.success) {
    const issue = parsed.error.issues[0]
    const detail = `${issue?.path.join('.') || 'the file'}: ${issue?.message ?? 'unreadable'}`
    throw refuse('bytes-malformed', { detail, where: { file } })
  }
  const { protocol } = parsed.data
  if (protocol !== protocolVersion) {
    const detail = `the coordinator speaks version ${protocol}, this worker version ${protocolVersion}`
    throw refuse('protocol-mismatch', { detail, where: { file } })
  }
  return parsed.data
}

function parseJson(text: string): unknown {
  try {
    return JSON.parse(text)
  } catch {
    return undefined
  }
}

/** The server of the record in `folder`, wherever its coordinator runs now. */
export function recordLocation(folder: string): QueueLocation {
  return { current: async () => readRendezvous(folder).url }
}

/** The key that the record's coordinator signs with, as long as it says one. */
export function recordKey(folder: string): Uint8Array | undefined {
  try {
    const { clusterKey } = readRendezvous(folder)
    return clusterKey === undefined ? undefined : Uint8Array.from(Buffer.from(clusterKey, 'hex'))
  } catch {
    // Without the file nothing of this coordinator can be reached either.
    return undefined
  }
}
