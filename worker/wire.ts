// What travels between the pool and those who simulate. Batches are packed into a few flat arrays, whose memory is
// handed over instead of copied: a trivial simulation must not cost more to send than to run.

import { check } from '../shared/check.js'
import type { EvaluationResult, SimulationFailure, WorkItem } from '../shared/result.js'

/** What whoever simulates must know, once. */
export interface SimulatorSettings {
  /** The pinned bundle. */
  readonly pluginFile: string
  readonly seed: number
  readonly sharedConditions: boolean
}

export interface BatchMessage {
  readonly batch: number
  /**
   * Nine numbers an item: island, evaluation, attempt, individual, firstReplicate, replicates, expectedCost, start and
   * end of its genome in `genomes`. Items in batches are for evaluation and shared: others travel alone.
   */
  readonly items: Float64Array<ArrayBuffer>
  readonly genomes: Uint8Array<ArrayBuffer>
}

/** Results of items first, first + 1, ... of a batch. */
export interface DoneMessage {
  readonly kind: 'done'
  readonly batch: number
  readonly first: number
  /** Three numbers an item: CPU seconds, wall seconds, how many values it has. */
  readonly numbers: Float64Array<ArrayBuffer>
  /** The values of all items, one after the other. */
  readonly values: Float64Array<ArrayBuffer>
  /** 32 bytes an item. */
  readonly digests: Uint8Array<ArrayBuffer>
  /** Only items that have failures: place in this message, then the failures. */
  readonly failures: readonly (readonly [number, readonly SimulationFailure[]])[]
}
/** The other things a simulator says. */
export type SimulatorMessage =
  | { readonly kind: 'ready' }
  /** The bundle cannot be loaded. */
  | { readonly kind: 'unusable'; readonly reason: string }
  /** A promise of our own code was broken; the whole house stops. */
  | { readonly kind: 'broken'; readonly promise: string }
  | DoneMessage

const itemNumbers = 9
const resultNumbers = 3
const digestBytes = 32

/** Copies the items into a message of their own memory. */
export function packBatch(batch: number, list: readonly WorkItem[]): BatchMessage {
  const items = new Float64Array(list.length * itemNumbers)
  const genomes = new Uint8Array(list.reduce((sum, item) => sum + item.genome.length, 0))
  let end = 0
  for (const [i, item] of list.entries()) {
    genomes.set(item.genome, end)
    const { island, evaluation, attempt, individual, firstReplicate, replicates, expectedCost } = item
    const own = [island, evaluation, attempt, individual, firstReplicate, replicates, expectedCost]
    items.set([...own, end, end + item.genome.length], i * itemNumbers)
    end += item.genome.length
  }
  return { batch, items, genomes }
}

export function batchLength(message: BatchMessage): number {
  return message.items.length / itemNumbers
}

/** Item `index` of a batch; its genome is a view of the message. */
export function unpackItem(message: BatchMessage, index: number): WorkItem {
  const at = index * itemNumbers
  check(at + itemNumbers <= message.items.length, 'an item asked for is in its batch')
  const number = (place: number): number => message.items[at + place]!
  return {
    island: number(0),
    evaluation: number(1),
    attempt: number(2),
    individual: number(3),
    firstReplicate: number(4),
    replicates: number(5),
    expectedCost: number(6),
    genome: message.genomes.subarray(number(7), number(8)),
    purpose: 'evaluate',
    isolation: 'shared',
    avoid: [],
  }
}

/** One simulated item. */
export interface Simulated {
  readonly result: EvaluationResult
  readonly digest: Uint8Array
  readonly cpuSeconds: number
  readonly wallSeconds: number
}

export function packDone(batch: number, first: number, list: readonly Simulated[]): DoneMessage {
  const numbers = new Float64Array(list.length * resultNumbers)
  const values = new Float64Array(list.reduce((sum, { result }) => sum + result.values.length, 0))
  const digests = new Uint8Array(list.length * digestBytes)
  const failures: [number, readonly SimulationFailure[]][] = []
  let end = 0
  for (const [i, { result, digest, cpuSeconds, wallSeconds }] of list.entries()) {
    numbers.set([cpuSeconds, wallSeconds, result.values.length], i * resultNumbers)
    values.set(result.values, end)
    digests.set(digest, i * digestBytes)
    if (result.failures.length > 0) failures.push([i, result.failures])
    end += result.values.length
  }
  return { kind: 'done', batch, first, numbers, values, digests, failures }
}

/** The results of a message, each with memory of its own, so that keeping one does not keep the whole message. */
export function unpackDone(message: DoneMessage): Simulated[] {
  const failures = new Map(message.failures)
  const list: Simulated[] = []
  let end = 0
  for (let i = 0; i * resultNumbers < message.numbers.length; i++) {
    const start = end
    end += message.numbers[i * resultNumbers + 2]!
    list.push({
      result: { values: message.values.slice(start, end), failures: failures.get(i) ?? [] },
      digest: message.digests.slice(i * digestBytes, (i + 1) * digestBytes),
      cpuSeconds: message.numbers[i * resultNumbers]!,
      wallSeconds: message.numbers[i * resultNumbers + 1]!,
    })
  }
  check(end === message.values.length, 'every value of a message belongs to one of its results')
  return list
}

/** The memory of a message that may be handed over instead of copied. */
export function transferable(message: BatchMessage | DoneMessage): ArrayBuffer[] {
  if ('genomes' in message) return [message.items.buffer, message.genomes.buffer]
  return [message.numbers.buffer, message.values.buffer, message.digests.buffer]
}
