// What happens when, in virtual time: a heap of calls, those of one time in the order in which they were put in.

interface Entry {
  readonly atMs: number
  readonly order: number
  readonly call: () => void
}

export class Timetable {
  readonly #heap: Entry[] = []
  #orders = 0
  #nowMs = 0

  get nowMs(): number {
    return this.#nowMs
  }
  /** Infinity when nothing is to come. */
  get nextMs(): number {
    return this.#heap[0]?.atMs ?? Number.POSITIVE_INFINITY
  }

  at(atMs: number, call: () => void): void {
    const heap = this.#heap
    const entry = { atMs, order: this.#orders++, call }
    let place = heap.push(entry) - 1
    while (place > 0) {
      const above = (place - 1) >> 1
      if (!isBefore(entry, heap[above]!)) break
      heap[place] = heap[above]!
      place = above
    }
    heap[place] = entry
  }

  /** Lets everything of the next time happen, and what that puts in for the same time. */
  step(): void {
    this.#nowMs = this.nextMs
    while (this.nextMs === this.#nowMs) this.#pop()!.call()
  }

  #pop(): Entry | undefined {
    const heap = this.#heap
    const first = heap[0]
    const last = heap.pop()
    if (!last || first === last) return first
    let place = 0
    for (;;) {
      let below = 2 * place + 1
      if (below >= heap.length) break
      if (below + 1 < heap.length && isBefore(heap[below + 1]!, heap[below]!)) below++
      if (!isBefore(heap[below]!, last)) break
      heap[place] = heap[below]!
      place = below
    }
    heap[place] = last
    return first
  }
}

function isBefore(a: Entry, b: Entry): boolean {
  return a.atMs < b.atMs || (a.atMs === b.atMs && a.order < b.order)
}
