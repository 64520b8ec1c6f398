import { dispatcherContract } from './dispatcher.js'
import { local } from './local.js'

// Threads that die, hang, eat memory, print and throw.
dispatcherContract('local', local, ['surviving'])
