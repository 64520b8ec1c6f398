// The post between islands: who has sent what in which epoch, and who sends nothing any more.

import type { Individual } from './types.js'

/** What an island put in the post at the end of an epoch; `ended` says that none follows. */
export interface Mail {
  readonly island: number
  readonly epoch: number
  readonly atCommit: number
  readonly ended: boolean
  readonly emigrants: readonly Individual[]
}

/** Mail between islands: who has sent what in which epoch, and who has ended. */
export class Post {
  readonly #mail = new Map<number, Map<number, readonly Individual[]>>()
  /** Epochs in which an island sends nothing because it had ended: from .. until. */
  readonly #silences = new Map<number, { readonly from: number; until: number }[]>()
  readonly #recorded: (island: number, epoch: number) => Mail | undefined

  constructor(recorded: (island: number, epoch: number) => Mail | undefined) {
    this.#recorded = recorded
  }

  put(mail: Mail): void {
    if (mail.ended) {
      this.#silencesOf(mail.island).push({ from: mail.epoch, until: Infinity })
    } else {
      const sent = this.#mail.get(mail.island) ?? new Map<number, readonly Individual[]>()
      sent.set(mail.epoch, mail.emigrants)
      this.#mail.set(mail.island, sent)
    }
  }

  hasEnded(island: number): boolean {
    return this.#silencesOf(island).some((silence) => silence.until === Infinity)
  }

  /** Known from a record: the island sent nothing for these epochs. */
  silence(island: number, from: number, until: number): void {
    this.#silencesOf(island).push({ from, until })
  }

  /** An ended island is going again: it sends mail for the epochs after `epoch`. */
  resume(island: number, epoch: number): void {
    for (const silence of this.#silencesOf(island)) silence.until = Math.min(silence.until, epoch)
  }

  /** The emigrants of that epoch; none when the island had ended; undefined while it may still send. */
  find(island: number, epoch: number): readonly Individual[] | undefined {
    const here = this.#mail.get(island)?.get(epoch)
    if (here) return here
    const silent = this.#silencesOf(island).some(({ from, until }) => from <= epoch && epoch <= until)
    if (silent) return []
    const recorded = this.#recorded(island, epoch)
    return recorded && !recorded.ended ? recorded.emigrants : undefined
  }

  forgetBefore(epoch: number): void {
    for (const sent of this.#mail.values()) {
      for (const key of sent.keys()) if (key < epoch) sent.delete(key)
    }
  }

  #silencesOf(island: number): { readonly from: number; until: number }[] {
    const known = this.#silences.get(island) ?? []
    this.#silences.set(island, known)
    return known
  }
}
