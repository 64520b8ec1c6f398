// What the command line needs of the agent.

export { Agent, type AgentEnd, type AgentOptions } from './agent.js'
export { memoryMB, processorClass, secondsLeft } from './machine.js'
export { serveMetrics } from './metrics.js'
export { cacheFolder, PluginCache, readKey } from './plugins.js'
export { recordKey, recordLocation } from './rendezvous.js'
export { fixedLocation, type QueueLocation } from './server.js'
