// Time as the dispatcher has it: handed in, so that a test can make a minute pass in one line.

export interface Clock {
  /** Monotonic milliseconds. */
  nowMs(): number
  /** Calls back once after so long; the answer calls it off. */
  after(ms: number, call: () => void): () => void
}

export function pause(clock: Clock, ms: number): Promise<void> {
  return new Promise((resolve) => {
    clock.after(ms, resolve)
  })
}
