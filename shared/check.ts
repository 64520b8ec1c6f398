// Broken promises between our own lines of code. What the world may do wrong is a Refusal (refusals.ts);
// the two are never mixed.

/** A broken promise between our own lines. Never caught on the way: the process stops (exit code 70). */
export class BrokenPromise extends Error {
  override readonly name = 'BrokenPromise'
}

/** Stops the process when one of our own promises does not hold. `promise` says what should have been true. */
export function check(truth: boolean, promise: string): asserts truth {
  if (!truth) throw new BrokenPromise(`broken promise: ${promise}`)
}
