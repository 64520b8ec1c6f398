// Healthy but idle cannot last: work is waiting, cores are free, and for a while nothing has been taken. Whatever the
// queue library says of itself, such an agent ends, so that a fresh one takes its place.

/** A pause of this process (stopped, swapped) counts as one look. */
const lookMostMs = 1000

export class Watchdog {
  private readonly limitMs: number
  private idleMs = 0
  private lastMs: number | undefined

  constructor(limitMs: number) {
    this.limitMs = limitMs
  }

  /** Something was taken. */
  took(): void {
    this.idleMs = 0
  }

  /**
   * Called regularly. `couldTake`: work is announced as waiting, there is room for it, and nothing that we know of stands
   * in the way. True when that has lasted too long.
   */
  look(nowMs: number, couldTake: boolean): boolean {
    const passedMs = this.lastMs === undefined ? 0 : Math.min(nowMs - this.lastMs, lookMostMs)
    this.lastMs = nowMs
    this.idleMs = couldTake ? this.idleMs + passedMs : 0
    return this.idleMs >= this.limitMs
  }
}
