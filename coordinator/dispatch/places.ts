// No more simulations at once than there are places, whatever the pool would do: its threads, the process that confirms
// and those for doubtful items together. For problems whose simulations take several cores, much memory or licences.
// What has no place waits here, first come, first served.

import type { DispatchFact, WorkItem } from '../../shared/result.js'
import type { LocalPool, LocalPoolEvents, LocalStatus } from './local.js'

/** Items a place has ahead, so that nobody waits for the coordinator between two simulations. */
const aheadOfEach = 2

/** The pool that `createPool` makes, never with more than `places` items in it. */
export function inPlaces(
  places: number,
  createPool: (events: LocalPoolEvents) => LocalPool,
): (events: LocalPoolEvents) => LocalPool {
  return (events) => new PlacesPool(places, createPool, events)
}

class PlacesPool implements LocalPool {
  private readonly places: number
  private readonly pool: LocalPool
  private waiting: WorkItem[] = []
  private inPool = 0
  private reportAt = 0

  constructor(
    places: number,
    createPool: (events: LocalPoolEvents) => LocalPool,
    { fact, failed }: LocalPoolEvents,
  ) {
    this.places = places
    this.pool = createPool({
      fact: (one: DispatchFact) => {
        if (one.kind !== 'fleet') this.inPool--
        this.fill()
        fact(one)
      },
      failed,
    })
  }

  start(): Promise<void> {
    return this.pool.start()
  }

  submit(items: readonly WorkItem[], reportAt: number): void {
    this.waiting.push(...items)
    this.reportAt = reportAt
    this.fill()
  }

  status(): LocalStatus {
    const outstanding = this.waiting.length + this.inPool
    return {
      slots: this.places,
      outstanding,
      wanted: Math.max(0, (1 + aheadOfEach) * this.places - outstanding),
      queued: outstanding,
      secondsEach: this.pool.status().secondsEach,
    }
  }

  close(): Promise<void> {
    this.waiting = []
    return this.pool.close()
  }

  private fill(): void {
    const next = this.waiting.splice(0, this.places - this.inPool)
    this.inPool += next.length
    // Answers are never gathered behind a place that is free: another item waits for it.
    if (next.length > 0) this.pool.submit(next, Math.max(this.reportAt, this.places))
  }
}
