// Licences: a number of tokens that the whole site shares, a few of which each simulation of some problem holds. They
// are taken from the queue server before a simulation begins, renewed while it runs, and kept for the next one of the
// same search; not for ever, so that agents elsewhere get their turn.

import type { Announcement } from '../../shared/cluster/messages.js'
import type { Server } from './server.js'

interface Receipt {
  readonly id: string
  readonly search: string
  readonly sinceMs: number
  inUse: boolean
  lost: boolean
}

export interface LicenceOptions {
  readonly server: Server
  readonly nowMs: () => number
  /** How long a receipt is used again and again before it goes back. */
  readonly tenureMs: number
  /** After a refusal, and after a receipt went back at the end of its tenure. */
  readonly retryMs: number
  readonly say: (sentence: string) => void
}

export class Licences {
  private readonly options: LicenceOptions
  private readonly receipts = new Map<string, Receipt>()
  private readonly blockedUntilMs = new Map<string, number>()

  constructor(options: LicenceOptions) {
    this.options = options
  }

  /** True while asking again would be too early. */
  isBlocked(search: string): boolean {
    return (this.blockedUntilMs.get(search) ?? 0) > this.options.nowMs()
  }

  /** A receipt for one simulation; undefined when there are not enough tokens, or nobody answers. */
  async acquire({ search, needs, tokens }: Announcement): Promise<string | undefined> {
    for (const receipt of this.receipts.values()) {
      if (receipt.search !== search || receipt.inUse || receipt.lost) continue
      receipt.inUse = true
      return receipt.id
    }
    if (this.isBlocked(search)) return undefined
    const { server } = this.options
    const giveBack = (id: string | undefined) => {
      if (id !== undefined) void server.ask((queue) => queue.returnTokens(id))
    }
    const asked = await server.ask((queue) => queue.takeTokens(needs.tokens, tokens), giveBack)
    const id = asked.done ? asked.value : undefined
    if (id === undefined) {
      this.block(search)
      return undefined
    }
    this.receipts.set(id, { id, search, sinceMs: this.options.nowMs(), inUse: true, lost: false })
    return id
  }

  /** The simulation has ended. */
  release(id: string): void {
    const receipt = this.receipts.get(id)
    if (receipt === undefined) return
    receipt.inUse = false
    const { nowMs, tenureMs } = this.options
    if (receipt.lost) this.receipts.delete(id)
    else if (nowMs() - receipt.sinceMs > tenureMs) {
      void this.giveBack(receipt)
      this.block(receipt.search)
    }
  }

  async renew(): Promise<void> {
    await Promise.all(
      [...this.receipts.values()].map(async (receipt) => {
        const renewed = await this.options.server.ask((queue) => queue.renewTokens(receipt.id))
        if (!renewed.done || renewed.value || receipt.lost) return
        receipt.lost = true
        if (receipt.inUse)
          this.options.say(
            `A licence for ${receipt.search} ran out while this worker could not renew it; the simulation that holds it goes on.`,
          )
        else this.receipts.delete(receipt.id)
      }),
    )
  }

  /** What nobody uses goes back to the site. */
  async returnUnused(): Promise<void> {
    await Promise.all(
      [...this.receipts.values()].filter(({ inUse }) => !inUse).map((one) => this.giveBack(one)),
    )
  }

  async returnAll(): Promise<void> {
    await Promise.all([...this.receipts.values()].map((one) => this.giveBack(one)))
  }

  private async giveBack({ id }: Receipt): Promise<void> {
    this.receipts.delete(id)
    await this.options.server.ask((queue) => queue.returnTokens(id))
  }

  private block(search: string): void {
    this.blockedUntilMs.set(search, this.options.nowMs() + this.options.retryMs)
  }
}
