// Answers of one search on their way to the queue server. They leave in batches, at once when a job is complete and
// otherwise after a short while, one message at a time; what could not be written stays and is tried again. Memory is
// bounded: beyond it an answer is given up, and its item is simulated again by somebody later.

import type { Answer } from '../../shared/cluster/codec.js'
import type { LossMessage } from '../../shared/cluster/messages.js'
import type { HeldJob } from './held.js'

export type Letter =
  | { readonly job: HeldJob; readonly answer: Answer }
  | { readonly job: HeldJob; readonly loss: LossMessage }

export interface OutboxOptions {
  /** Resolves to true when the server has them; otherwise they are sent again. */
  readonly send: (letters: readonly Letter[]) => Promise<boolean>
  readonly written: (letters: readonly Letter[]) => void
  /** Of a batch that need not go at once. */
  readonly lingerMs: number
  readonly retryMs: number
  readonly bytesMost: number
}

/** One message: large enough that few are sent, small enough for a slow network. */
const messageBytesMost = 2 ** 21
const lettersMost = 8_192

export class Outbox {
  private readonly options: OutboxOptions
  private letters: Letter[] = []
  private bytes = 0
  private timer: NodeJS.Timeout | undefined
  private sending: Promise<void> | undefined
  private retrying = false
  private closed = false

  constructor(options: OutboxOptions) {
    this.options = options
  }

  get length(): number {
    return this.letters.length
  }

  get answers(): number {
    return this.letters.filter((letter) => 'answer' in letter).length
  }

  /** More than half of what may be kept: nobody seems to take answers. */
  get isCrowded(): boolean {
    return this.bytes > this.options.bytesMost / 2
  }

  /** False when there is no room: the answer is given up. A loss is small and always goes. */
  put(letter: Letter, isUrgent: boolean): boolean {
    const bytes = bytesOf(letter)
    if ('answer' in letter && this.bytes + bytes > this.options.bytesMost) return false
    this.letters.push(letter)
    this.bytes += bytes
    if (isUrgent && !this.retrying) this.hurry()
    else this.timer ??= setTimeout(() => this.hurry(), this.options.lingerMs)
    return true
  }

  /** The server can be reached again: what waited for another try goes now. */
  retry(): void {
    this.retrying = false
    if (this.letters.length > 0) this.hurry()
  }

  /** Resolves when all is written, or when a try failed. */
  async flush(): Promise<void> {
    await this.sending
    this.retrying = false
    while (this.letters.length > 0 && !this.retrying && !this.closed) {
      this.hurry()
      await this.sending
    }
  }

  close(): void {
    this.closed = true
    clearTimeout(this.timer)
  }

  private hurry(): void {
    clearTimeout(this.timer)
    this.timer = undefined
    if (this.sending !== undefined || this.letters.length === 0 || this.closed) return
    this.sending = this.sendOne().finally(() => {
      this.sending = undefined
      if (this.letters.length === 0 || this.closed || this.timer !== undefined) return
      if (this.retrying) this.timer = setTimeout(() => this.retry(), this.options.retryMs)
      else this.hurry()
    })
  }

  private async sendOne(): Promise<void> {
    let bytes = 0
    let count = 0
    for (const letter of this.letters) {
      bytes += bytesOf(letter)
      if (count > 0 && (bytes > messageBytesMost || count >= lettersMost)) break
      count++
    }
    const batch = this.letters.slice(0, count)
    if (!(await this.options.send(batch))) {
      this.retrying = true
      return
    }
    this.letters.splice(0, count)
    for (const letter of batch) this.bytes -= bytesOf(letter)
    this.options.written(batch)
  }
}

/** Roughly what a letter takes in memory and in a message. */
function bytesOf(letter: Letter): number {
  if ('loss' in letter) return 300 + letter.loss.detail.length
  return 200 + 8 * letter.answer.result.values.length + 100 * letter.answer.result.failures.length
}
