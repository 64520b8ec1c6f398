// Holding a record alone: a second coordinator on this machine is refused at once; one on another machine is watched for
// signs of life first, because its node may have been taken away.

import { randomBytes } from 'node:crypto'
import { Refusal, refuse } from '../../../shared/refusals.js'
import { nameHolder, type OpenRecord, type Takeover, thisProcess } from '../../record/index.js'
import type { RunOptions } from '../run-options.js'
import type { OpenedSearch } from '../searchfile/open.js'
import { pause } from './pause.js'
import type { RecordPlace } from './place.js'

/** Seconds without a sign of life after which a coordinator on another machine counts as gone. */
const silenceSeconds = 15

/** The record, held by nobody else. A holder on another machine is watched first: its node may have been preempted. */
export async function openAlone(
  options: RunOptions,
  opened: OpenedSearch,
  place: RecordPlace,
): Promise<OpenRecord> {
  const open = (takeover: Takeover) =>
    place.open({
      create: {
        plan: opened.plan,
        searchText: opened.text,
        pluginCode: new TextEncoder().encode(opened.bundle.code),
      },
      holder: thisProcess(),
      nonce: randomBytes(16).toString('hex'),
      clock: Date.now,
      takeover,
    })
  for (;;) {
    try {
      return open(options.force ? 'force' : 'if-dead')
    } catch (fault) {
      const isHeld = fault instanceof Refusal && fault.code === 'record-in-use'
      if (!isHeld || (!options.standby && !isHeldElsewhere(place))) throw fault
      const record = await takeOverWhenSilent(options, place, open)
      if (record) return record
      if (!options.standby || options.signal.aborted) throw fault
    }
  }
}

/** Undefined when the holder gave a sign of life, or holds the record on this machine. */
async function takeOverWhenSilent(
  options: RunOptions,
  place: RecordPlace,
  open: (takeover: Takeover) => OpenRecord,
): Promise<OpenRecord | undefined> {
  if (!isHeldElsewhere(place)) {
    await pause(standbyMs, options.signal)
    return undefined
  }
  const sentence = `The record is held on another machine; waiting ${silenceSeconds} s for a sign of life from there.`
  if (!options.standby) options.tell({ kind: 'said', sentence })
  const seen = await place.watch(silenceSeconds, (ms) => pause(ms, options.signal))
  if (!seen || options.signal.aborted) return undefined
  return open(seen)
}

/** How often a standby looks whether a holder on its own machine has ended. */
const standbyMs = 1000

/** A second coordinator on this machine is told at once, before its problem is bundled. */
export function refuseIfHeldHere(place: RecordPlace): void {
  if (!place.exists()) return
  const holder = place.holder()
  if (!holder?.running) return
  const cure = `Wait for it to end, or stop it: kill ${holder.pid}`
  throw refuse('record-in-use', { detail: nameHolder(holder), cure })
}

function isHeldElsewhere(place: RecordPlace): boolean {
  const holder = place.holder()
  return holder !== undefined && holder.running === undefined
}
