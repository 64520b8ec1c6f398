import { dispatcherContract } from './dispatcher.js'
import { local } from './local.js'

// Child processes for items that run alone and for confirmation.
dispatcherContract('local', local, ['isolating'])
