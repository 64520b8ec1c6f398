import { underWeather } from '../../coordinator/dispatch/weather.js'
import { dispatcherContract } from './dispatcher.js'
import { local } from './local.js'

dispatcherContract('local', local, ['answering', 'closing'])
dispatcherContract(
  'local, in hostile weather',
  (setting) => underWeather(local(setting), { seed: 7, maxDelayFactor: 1000, baseMs: 0.2 }),
  ['answering'],
)
