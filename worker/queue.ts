// Items that wait, first in, first out; items that come back go to the front. Taking is cheap however long it is.

import type { WorkItem } from '../shared/result.js'

export class WorkQueue {
  private items: WorkItem[] = []
  private first = 0

  get length(): number {
    return this.items.length - this.first
  }
  push(item: WorkItem): void {
    this.items.push(item)
  }
  putBack(items: readonly WorkItem[]): void {
    if (items.length === 0) return
    this.items = [...items, ...this.items.slice(this.first)]
    this.first = 0
  }
  take(count: number): WorkItem[] {
    const taken = this.items.slice(this.first, this.first + count)
    this.first += taken.length
    if (this.first > 1024 && this.first * 2 > this.items.length) {
      this.items = this.items.slice(this.first)
      this.first = 0
    }
    return taken
  }
  *[Symbol.iterator](): Iterator<WorkItem> {
    for (let i = this.first; i < this.items.length; i++) yield this.items[i]!
  }
}
