// What a running coordinator last showed of itself, when that is no longer news.

import { duration } from '../numbers.js'
import type { ProgressView } from '../progress-view.js'

/** A coordinator shows itself every second; one that has not for so long may be in trouble. */
const silentLeastSeconds = 15

/** The view as it was shown `silentSeconds` ago; says so where that is long. */
export function withSilence(shown: ProgressView, silentSeconds: number): ProgressView {
  if (silentSeconds < silentLeastSeconds || shown.state !== 'searching') return shown
  // A rate and a time to go would go on promising.
  const { rate: _, ...rest } = shown
  return {
    ...rest,
    because: `as of ${duration(silentSeconds)} ago; nothing was written since: its machine may be busy, or its disk full`,
  }
}
