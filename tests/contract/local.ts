// The local dispatcher as the contract suite asks for it.

import { localDispatcher } from '../../coordinator/dispatch/local.js'
import { createPool } from '../../worker/pool.js'
import type { MakeDispatcher } from './dispatcher.js'

export const local: MakeDispatcher = ({ slots, leastSeconds, unmeasuredSeconds, ...settings }) =>
  localDispatcher((events) =>
    createPool({ ...settings, threads: slots, timeLimit: { leastSeconds, unmeasuredSeconds } }, events),
  )
