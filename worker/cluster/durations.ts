// How long the latest evaluations of a search took, so that none is begun that cannot end in time.

const kept = 200

export class Durations {
  private readonly latest: number[] = []
  private next = 0

  note(wallSeconds: number): void {
    this.latest[this.next] = wallSeconds
    this.next = (this.next + 1) % kept
  }

  /** 95 of 100 took no longer (nearest rank); undefined before the first. */
  p95Seconds(): number | undefined {
    if (this.latest.length === 0) return undefined
    const sorted = [...this.latest].sort((a, b) => a - b)
    return sorted[Math.ceil(0.95 * sorted.length) - 1]
  }
}
