// Which search may have the next free core: deficit round robin (Shreedhar and Varghese, Efficient Fair Queuing using
// Deficit Round Robin, 1995) over simulated seconds. A search is served while it has credit; when it has none, the turn
// goes to the next; a full round gives each that wants something credit in proportion to its share.
//
// What a simulation costs is known only afterwards: it is charged as expected when it begins and corrected when it
// ends, so a search of dear simulations pays its debt before its next turn.

/** Seconds that a search of share 1 is credited a round. */
const quantumSeconds = 1
/** A search that wanted nothing for a while neither saves credit nor drags debt of more than this along. */
const debtMostSeconds = 600

interface Account {
  share: number
  creditSeconds: number
}

export class Shares {
  private readonly accounts = new Map<string, Account>()
  /** The search whose turn it is. */
  private turn: string | undefined

  /** A search joins, or its share changes. */
  set(search: string, share: number): void {
    const account = this.accounts.get(search)
    if (account === undefined) this.accounts.set(search, { share, creditSeconds: 0 })
    else account.share = share
  }

  remove(search: string): void {
    this.accounts.delete(search)
  }

  /** Whose turn it is among those that want something; undefined when nobody does. Asking changes no charge. */
  pick(wanting: readonly string[]): string | undefined {
    const known = wanting.filter((search) => this.accounts.has(search))
    if (known.length === 0) return undefined
    this.settle(known)
    const place = this.turn === undefined ? -1 : known.indexOf(this.turn)
    const order = place < 0 ? known : [...known.slice(place), ...known.slice(0, place)]
    let next = order.find((search) => this.credit(search) > 0)
    if (next === undefined) {
      this.credited(known)
      next = order.find((search) => this.credit(search) > 0)
    }
    this.turn = next
    return next
  }

  /** Seconds are charged when they are expected (`charge(a, expected)`), then corrected (`charge(a, real - expected)`). */
  charge(search: string, seconds: number): void {
    const account = this.accounts.get(search)
    if (account !== undefined) account.creditSeconds -= seconds
  }

  /** Credit of those that want nothing ends: a queue that was empty has no claim on the past. */
  private settle(known: readonly string[]): void {
    for (const [search, account] of this.accounts) {
      if (known.includes(search)) continue
      account.creditSeconds = Math.max(-debtMostSeconds, Math.min(0, account.creditSeconds))
    }
  }

  /** As many rounds at once as it takes until somebody has credit. */
  private credited(known: readonly string[]): void {
    const roundsOf = ({ share, creditSeconds }: Account) =>
      Math.floor(-creditSeconds / (quantumSeconds * share)) + 1
    const accounts = known.map((search) => this.accounts.get(search)!)
    const rounds = Math.min(...accounts.map(roundsOf))
    for (const account of accounts) account.creditSeconds += rounds * quantumSeconds * account.share
  }

  private credit(search: string): number {
    return this.accounts.get(search)!.creditSeconds
  }
}
