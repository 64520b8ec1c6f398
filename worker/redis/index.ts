// What the rest of the house needs of this folder: the two sides of the queue server over Redis. No other folder
// knows BullMQ or the client library.

export {
  addressVariable,
  certificateVariable,
  isLoopback,
  parseAddress,
  type RedisAddress,
  showAddress,
} from './address.js'
export { type AgentQueueOptions, RedisAgentQueue } from './agent-queue.js'
export { type CoordinatorQueueOptions, RedisCoordinatorQueue } from './coordinator-queue.js'
