// What coordinator and agents say to one another through Redis. Each side validates what it reads: the other may be
// an older version, another program, or lying.
//
// Control (announcements, heartbeats) is JSON, so that a person can read it with any Redis client; jobs and results
// are msgpack (codec.ts), because they are many.

import { z } from 'zod'
import { limits } from '../limits.js'

/** Raised with every change that an older side would misread; another version is refused by name. */
export const protocolVersion = 1

const name = z.string().min(1).max(256)
const count = z.number().int().nonnegative()

/** How much a problem promises of its results (design: exactness). */
export const exactnesses = ['bits', 'bits-per-processor', 'tolerance', 'statistical'] as const
export type Exactness = (typeof exactnesses)[number]

/** What one simulation asks of a machine. */
export const needsSchema = z.strictObject({
  cores: z.number().int().min(1).max(limits.threadsMost).default(1),
  memoryMB: z.number().int().min(1).max(limits.megabytesMost).default(limits.megabytesUsual),
  /** Licences: how many of each token one simulation holds. */
  tokens: z.record(z.string().max(64), z.number().int().min(1)).default({}),
})
export type Needs = z.infer<typeof needsSchema>

/** A search, as its coordinator announces it; written again every few seconds with the next `beat`. */
export const announcementSchema = z.strictObject({
  protocol: z.number(),
  search: name,
  /** Identity of the record: two searches of one name are told apart by it. */
  record: name,
  /** The coordinator's hold on the record: a later one has a larger number. */
  holder: count,
  /** Which filling of Redis its jobs belong to. */
  instance: name,
  beat: count,
  /** SHA-256 of the pinned bundle, hex. */
  pluginDigest: z.string().length(64),
  pluginBytes: count,
  /** HMAC-SHA256 of the digest under the cluster key, hex; absent where the site has no key. */
  signature: z.string().length(64).optional(),
  seed: z.number(),
  sharedConditions: z.boolean(),
  exactness: z.enum(exactnesses),
  needs: needsSchema,
  /** Site-wide number of each token. */
  tokens: z.record(z.string().max(64), z.number().int().min(0)).default({}),
  /** Wall seconds of one replicate at expected cost 1, where known. */
  secondsPerCost: z.number().positive().optional(),
  /** Relative share of the fleet among searches that have work. */
  share: z.number().positive().default(1),
  /** Hosts and agents that are shut out of this search. */
  shutOut: z.array(name).default([]),
  /** Agents, or hosts, that should finish what they hold and take no more. */
  draining: z.array(name).default([]),
  /** Evaluations are waiting in its queues: an agent that takes none of them is ill. */
  waiting: z.boolean().default(false),
  skerry: z.string().max(64),
})
export type Announcement = z.infer<typeof announcementSchema>

/**
 * An announcement of any version, as an agent hears it: of another one no more than who speaks is believed, so that the
 * agent can say why it does not serve that search.
 */
export const heardAnnouncementSchema: z.ZodType<Announcement> = z.union([
  announcementSchema,
  z
    .looseObject({
      protocol: z.number(),
      search: name,
      beat: count.catch(0),
      skerry: z.string().max(64).catch('?'),
    })
    .refine(({ protocol }) => protocol !== protocolVersion)
    .transform(
      ({ protocol, search, beat, skerry }): Announcement => ({
        ...unknownSearch,
        protocol,
        search,
        beat,
        skerry,
      }),
    ),
])

const unknownSearch = {
  record: '?',
  holder: 0,
  instance: '?',
  pluginDigest: '0'.repeat(64),
  pluginBytes: 0,
  seed: 0,
  sharedConditions: false,
  exactness: 'bits',
  needs: { cores: 1, memoryMB: 1, tokens: {} },
  tokens: {},
  share: 1,
  shutOut: [],
  draining: [],
  waiting: false,
} as const satisfies Partial<Announcement>

/** States of an agent, each with what it means to a person. */
export const agentStates = {
  starting: 'connects, has taken nothing yet',
  idle: 'could work, finds nothing to do',
  working: 'simulates',
  'cut-off': 'cannot reach Redis; goes on with what it has and tries again',
  draining: 'finishes what it holds, takes no more',
  leaving: 'hands back what is unfinished and ends',
} as const
export type AgentState = keyof typeof agentStates
const stateNames = Object.keys(agentStates) as [AgentState, ...AgentState[]]

/** What an agent says about itself; `beat` grows with each, so that clocks need not agree. */
export const heartbeatSchema = z.strictObject({
  protocol: z.number(),
  agent: name,
  host: name,
  /** Processors of one class are expected to give the same last bits, e.g. 'x64 AuthenticAMD 25/1'. */
  processor: name,
  node: z.string().max(64),
  skerry: z.string().max(64),
  pid: count,
  cores: z.number().int().min(1),
  beat: count,
  state: z.enum(stateNames),
  /** Seconds in this state, by the agent's own clock. */
  stateSeconds: z.number().nonnegative(),
  /** Dispatch numbers it holds, by search. */
  held: z.record(name, z.array(count).max(100_000)),
  /** Simulations finished since the start, failures among them, and items lost or handed back. */
  simulations: count,
  failures: count,
  lost: count,
  handedBack: count,
  /** Simulations per second over the last minute. */
  rate: z.number().nonnegative(),
  memoryMB: z.number().nonnegative(),
  /** When it will leave, in seconds from now; absent when nobody said so. */
  leavesInSeconds: z.number().optional(),
  lastWord: z.string().max(limits.lossDetailLength).default(''),
})
export type Heartbeat = z.infer<typeof heartbeatSchema>

/** What items of one job have in common, beside the packed items themselves. */
export const jobHeaderSchema = z.strictObject({
  protocol: z.number(),
  search: name,
  record: name,
  instance: name,
  /** Never used twice within a record: holder * 2^32 + running number. */
  dispatch: count,
  purpose: z.enum(['evaluate', 'confirm']),
  isolation: z.enum(['shared', 'alone']),
  /** Workers that must not do it, and hosts. */
  avoid: z.array(name).max(100_000),
  avoidHosts: z.array(name).max(100_000),
})
export type JobHeader = z.infer<typeof jobHeaderSchema>

export const executorSchema = z.strictObject({
  kind: z.enum(['thread', 'process']),
  worker: name,
  host: name,
  processor: name.optional(),
})

/** Answers of one agent, any number of jobs at a time. */
export const answersHeaderSchema = z.strictObject({
  protocol: z.number(),
  search: name,
  record: name,
  agent: name,
  host: name,
  processor: name,
  pluginDigest: z.string().length(64),
  skerry: z.string().max(64),
})
export type AnswersHeader = z.infer<typeof answersHeaderSchema>

export const lossSchema = z.strictObject({
  dispatch: count,
  /** Place in its job. */
  index: count,
  cause: z.enum(['died', 'time-limit', 'memory', 'agent-lost', 'handed-back']),
  detail: z.string().max(4 * limits.lossDetailLength),
  executor: executorSchema,
})
export type LossMessage = z.infer<typeof lossSchema>
