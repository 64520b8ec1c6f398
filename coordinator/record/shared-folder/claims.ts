// Who may write a record in a shared folder. Every coordinator creates the file of the next epoch, which must not exist:
// of two only one can. From then on what an earlier coordinator still writes does not count, however late it notices:
// each epoch's journal begins by naming the append it goes on from, and nothing of an earlier epoch beyond that append
// is ever read again. No clock of two machines is compared.
//
//   claim-000000000007        who made it, as JSON; created exclusively
//   claim-000000000007.beat   one byte longer with every sign of life
//   claim-000000000007.gone   its holder has let the record go

import {
  appendFileSync,
  existsSync,
  readdirSync,
  readFileSync,
  rmSync,
  statSync,
  writeFileSync,
} from 'node:fs'
import { join } from 'node:path'
import { z } from 'zod'
import { refuse } from '../../../shared/refusals.js'
import { fileTrouble } from '../files.js'
import type { ProcessIdentity } from '../holder.js'

const digits = 12
const beatsMost = 1 << 20
const pattern = /^claim-(\d{12})$/

const claimSchema = z.object({
  epoch: z.number().int().positive(),
  nonce: z.string(),
  host: z.string(),
  machine: z.string(),
  pid: z.number().int(),
  processStart: z.string(),
  sinceMs: z.number(),
})
export type Claimed = z.infer<typeof claimSchema>

const numbered = (epoch: number): string => String(epoch).padStart(digits, '0')
const fileOf = (folder: string, epoch: number): string => join(folder, `claim-${numbered(epoch)}`)

/** The highest claim there is; epoch 0 when nobody ever claimed the record. */
export function lastEpoch(folder: string): number {
  const epochs = readdirSync(folder).flatMap((name) => {
    const match = pattern.exec(name)
    return match ? [Number(match[1])] : []
  })
  return Math.max(0, ...epochs)
}

/** Who holds the record; undefined when nobody does, or the claim was only half written when its maker died. */
export function claimOf(folder: string, epoch: number): Claimed | undefined {
  if (epoch === 0 || existsSync(`${fileOf(folder, epoch)}.gone`)) return undefined
  try {
    return claimSchema.parse(JSON.parse(readFileSync(fileOf(folder, epoch), 'utf8')))
  } catch {
    return undefined
  }
}

/** How many signs of life the holder has given. */
export function beatsOf(folder: string, epoch: number): number {
  try {
    return statSync(`${fileOf(folder, epoch)}.beat`).size
  } catch {
    return 0
  }
}

/** The right to append in one epoch. */
export class Claim {
  readonly epoch: number
  readonly #folder: string
  #beats = 0

  private constructor(folder: string, epoch: number) {
    this.#folder = folder
    this.epoch = epoch
  }

  /** Claims the epoch after `previous`. @throws Refusal 'record-in-use' when another was faster */
  static make(
    folder: string,
    previous: number,
    me: ProcessIdentity,
    nonce: string,
    clock: () => number,
  ): Claim {
    const epoch = previous + 1
    const claimed: Claimed = { ...me, epoch, nonce, sinceMs: Math.trunc(clock()) }
    const path = fileOf(folder, epoch)
    try {
      writeFileSync(path, JSON.stringify(claimed), { flag: 'wx', flush: true })
    } catch (error) {
      if (!existsSync(path)) throw fileTrouble(error, path)
      throw refuse('record-in-use', { detail: 'another coordinator has claimed it this moment' })
    }
    return new Claim(folder, epoch)
  }

  /** As far as the file system shows it by now. @throws Refusal 'record-fenced' when a later claim is there */
  assertHeld(): void {
    const path = fileOf(this.#folder, this.epoch + 1)
    if (!existsSync(path)) return
    const now = claimOf(this.#folder, lastEpoch(this.#folder))
    const detail = now
      ? `process ${now.pid} on ${now.host} has claimed it`
      : 'a later coordinator has claimed it'
    throw refuse('record-fenced', { detail })
  }

  beat(): void {
    const path = `${fileOf(this.#folder, this.epoch)}.beat`
    try {
      if (this.#beats++ % beatsMost === 0) writeFileSync(path, '.')
      else appendFileSync(path, '.')
    } catch (error) {
      throw fileTrouble(error, path)
    }
  }

  /** Lets the record go, so that the next coordinator need not watch for signs of life. */
  release(): void {
    try {
      writeFileSync(`${fileOf(this.#folder, this.epoch)}.gone`, '')
    } catch {
      // The next coordinator watches, and finds nobody.
    }
  }
}

/** Removes claims that nobody asks about any more; the last ones stay. */
export function forgetClaims(folder: string, before: number): void {
  for (const name of readdirSync(folder)) {
    const match = /^claim-(\d{12})/.exec(name)
    if (match && Number(match[1]) < before) rmSync(join(folder, name), { force: true })
  }
}
