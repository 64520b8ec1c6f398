import { dispatcherContract } from '../contract/dispatcher.js'
import { overRedis } from '../contract/redis.js'

dispatcherContract('redis', overRedis(), ['surviving'])
