import { underWeather } from '../../coordinator/dispatch/weather.js'
import { dispatcherContract } from '../contract/dispatcher.js'
import { overRedis } from '../contract/redis.js'

dispatcherContract('redis', overRedis(), ['answering', 'closing'])
dispatcherContract('redis, three machines', overRedis(3), ['answering'])
dispatcherContract(
  'redis, in hostile weather',
  (setting) => underWeather(overRedis()(setting), { seed: 7, maxDelayFactor: 1000, baseMs: 0.2 }),
  ['answering'],
)
