// Jobs and answers as bytes: a small header and flat arrays in msgpack, validated when they are read. Whoever
// reads trusts nothing: lengths must fit each other, numbers must be finite, a digest must be that of its values.

import { Packr } from 'msgpackr'
import { z } from 'zod'
import { check } from '../check.js'
import { digestBytes, equalBytes, resultDigest } from '../digests.js'
import { limits } from '../limits.js'
import type { EvaluationResult, Executor, WorkItem } from '../result.js'
import {
  type AnswersHeader,
  answersHeaderSchema,
  executorSchema,
  type JobHeader,
  jobHeaderSchema,
  type LossMessage,
  lossSchema,
} from './messages.js'

const packr = new Packr({ moreTypes: true, useRecords: false })

/** Nine numbers an item: island, evaluation, attempt, individual, firstReplicate, replicates, expectedCost, genome from, to. */
const itemNumbers = 9

export interface Job {
  readonly header: JobHeader
  readonly items: readonly WorkItem[]
}
/** One simulated item of a job. */
export interface Answer {
  readonly dispatch: number
  /** Place in its job. */
  readonly index: number
  readonly item: Pick<WorkItem, 'island' | 'evaluation' | 'attempt' | 'purpose'>
  /** contentWord() of the item: by it a later coordinator knows the work, whatever number it had. */
  readonly content?: number
  readonly result: EvaluationResult
  readonly digest: Uint8Array
  readonly executor: Executor
  readonly cpuSeconds: number
  readonly wallSeconds: number
}
export interface Answers {
  readonly header: AnswersHeader
  readonly answers: readonly Answer[]
  readonly losses: readonly LossMessage[]
}

/** What was read cannot be what one of ours wrote: `reason` says why. */
export class Malformed extends Error {
  override readonly name = 'Malformed'
}

// --------------------------------------------------------------------------------------------- jobs

const jobSchema = z.object({
  header: z.unknown(),
  items: z.instanceof(Float64Array),
  genomes: z.instanceof(Uint8Array),
})

export function encodeJob({ header, items }: Job): Uint8Array {
  const numbers = new Float64Array(items.length * itemNumbers)
  const genomes = new Uint8Array(items.reduce((sum, item) => sum + item.genome.length, 0))
  let end = 0
  for (const [i, item] of items.entries()) {
    genomes.set(item.genome, end)
    const { island, evaluation, attempt, individual, firstReplicate, replicates, expectedCost } = item
    const own = [island, evaluation, attempt, individual, firstReplicate, replicates, expectedCost]
    numbers.set([...own, end, end + item.genome.length], i * itemNumbers)
    end += item.genome.length
  }
  return packr.pack({ header, items: numbers, genomes })
}

/** @throws Malformed */
export function decodeJob(bytes: Uint8Array): Job {
  const { header: rawHeader, items: numbers, genomes } = decoded(jobSchema, bytes)
  const header = parsed(jobHeaderSchema, rawHeader)
  const count = numbers.length / itemNumbers
  if (!Number.isInteger(count) || count < 1 || count > limits.dispatchBatch) throw new Malformed('item count')
  const items = Array.from({ length: count }, (_, i): WorkItem => {
    const at = (place: number): number => natural(numbers[i * itemNumbers + place]!)
    const [start, end] = [at(7), at(8)]
    if (start > end || end > genomes.length) throw new Malformed('a genome lies outside its bytes')
    return {
      island: at(0),
      evaluation: at(1),
      attempt: at(2),
      individual: at(3),
      firstReplicate: at(4),
      replicates: at(5),
      expectedCost: at(6),
      genome: genomes.slice(start, end),
      purpose: header.purpose,
      isolation: header.isolation,
      avoid: header.avoid,
    }
  })
  return { header, items }
}

// ------------------------------------------------------------------------------------------ answers

/**
 * Ten numbers an answer: dispatch, index, island, evaluation, attempt, CPU seconds, wall seconds, values, executor,
 * content (0: not said).
 */
const answerNumbers = 10

/**
 * A word of 53 bits that tells one piece of work from another: what is simulated, not under which number. No
 * protection against forgery, which needs none: whoever can write answers can write any. Two multiplicative hashes
 * (after Fowler, Noll and Vo; and Appleby's MurmurHash, from memory).
 */
export function contentWord({
  individual,
  firstReplicate,
  replicates,
  genome,
}: Pick<WorkItem, 'individual' | 'firstReplicate' | 'replicates' | 'genome'>): number {
  let a = 0x811c9dc5
  let b = 0x9747b28c
  const mix = (word: number) => {
    a = Math.imul(a ^ word, 0x01000193)
    b = Math.imul(b ^ word, 0x5bd1e995)
    b ^= b >>> 15
  }
  for (const count of [individual, firstReplicate, replicates]) {
    mix((count % 2 ** 32) | 0)
    mix(Math.floor(count / 2 ** 32))
  }
  for (let i = 0; i < genome.length; i++) mix(genome[i]!)
  return Math.max(1, (a >>> 0) * 2 ** 21 + (b >>> 11))
}

const answersSchema = z.object({
  header: z.unknown(),
  numbers: z.instanceof(Float64Array),
  purposes: z.instanceof(Uint8Array),
  values: z.instanceof(Float64Array),
  digests: z.instanceof(Uint8Array),
  executors: z.array(executorSchema).max(limits.threadsMost * 2),
  failures: z.array(
    z.tuple([
      z.number().int().nonnegative(),
      z.array(
        z.strictObject({
          simulation: z.number().int().nonnegative(),
          reason: z.string().max(limits.failureReasonLength),
        }),
      ),
    ]),
  ),
  losses: z.array(lossSchema).max(100_000),
})

export function encodeAnswers({ header, answers, losses }: Answers): Uint8Array {
  const numbers = new Float64Array(answers.length * answerNumbers)
  const values = new Float64Array(answers.reduce((sum, { result }) => sum + result.values.length, 0))
  const digests = new Uint8Array(answers.length * digestBytes)
  const purposes = new Uint8Array(answers.length)
  const executors: Executor[] = []
  const failures: [number, EvaluationResult['failures']][] = []
  let end = 0
  for (const [i, answer] of answers.entries()) {
    const { dispatch, index, item, content = 0, result, digest, executor, cpuSeconds, wallSeconds } = answer
    let known = executors.findIndex(({ worker }) => worker === executor.worker)
    if (known < 0) known = executors.push(executor) - 1
    const own = [dispatch, index, item.island, item.evaluation, item.attempt, cpuSeconds, wallSeconds]
    numbers.set([...own, result.values.length, known, content], i * answerNumbers)
    purposes[i] = item.purpose === 'confirm' ? 1 : 0
    values.set(result.values, end)
    digests.set(digest, i * digestBytes)
    if (result.failures.length > 0) failures.push([i, result.failures])
    end += result.values.length
  }
  return packr.pack({ header, numbers, purposes, values, digests, executors, failures, losses })
}

/** @throws Malformed, also when a digest is not that of its values. */
export function decodeAnswers(bytes: Uint8Array): Answers {
  const raw = decoded(answersSchema, bytes)
  const header = parsed(answersHeaderSchema, raw.header)
  const failures = new Map(raw.failures)
  const count = raw.numbers.length / answerNumbers
  if (!Number.isInteger(count) || raw.digests.length !== count * digestBytes || raw.purposes.length !== count)
    throw new Malformed('lengths that do not fit each other')
  let end = 0
  const answers = Array.from({ length: count }, (_, i): Answer => {
    const at = (place: number): number => raw.numbers[i * answerNumbers + place]!
    const start = end
    end += natural(at(7))
    if (end > raw.values.length) throw new Malformed('values are missing')
    const executor = raw.executors[natural(at(8))]
    if (executor === undefined) throw new Malformed('an executor is missing')
    const result = { values: raw.values.slice(start, end), failures: failures.get(i) ?? [] }
    const digest = raw.digests.slice(i * digestBytes, (i + 1) * digestBytes)
    checkResult(result, digest)
    const content = natural(at(9))
    return {
      dispatch: natural(at(0)),
      index: natural(at(1)),
      item: {
        island: natural(at(2)),
        evaluation: natural(at(3)),
        attempt: natural(at(4)),
        purpose: raw.purposes[i] === 1 ? 'confirm' : 'evaluate',
      },
      ...(content === 0 ? {} : { content }),
      result,
      digest,
      executor: executorOf(executor),
      cpuSeconds: positive(at(5)),
      wallSeconds: positive(at(6)),
    }
  })
  if (end !== raw.values.length) throw new Malformed('values that belong to nobody')
  return { header, answers, losses: raw.losses }
}

function checkResult(result: EvaluationResult, digest: Uint8Array): void {
  if (!result.values.every(Number.isFinite)) throw new Malformed('a value that is not finite')
  if (!equalBytes(resultDigest(result), digest))
    throw new Malformed('a digest that is not that of its values')
}

type ParsedExecutor = z.infer<typeof executorSchema>

function executorOf({ processor, ...rest }: ParsedExecutor): Executor {
  return processor === undefined ? rest : { ...rest, processor }
}

// ----------------------------------------------------------------------------------------- the parts

function decoded<Schema extends z.ZodType>(schema: Schema, bytes: Uint8Array): z.infer<Schema> {
  let value: unknown
  try {
    value = packr.unpack(bytes)
  } catch {
    throw new Malformed('bytes that are no message')
  }
  return parsed(schema, value)
}

function parsed<Schema extends z.ZodType>(schema: Schema, value: unknown): z.infer<Schema> {
  const done = schema.safeParse(value)
  if (done.success) return done.data
  const issue = done.error.issues[0]
  check(issue !== undefined, 'a refused message has a reason')
  throw new Malformed(`${issue.path.join('.') || 'message'}: ${issue.message}`)
}

function natural(value: number): number {
  if (!Number.isSafeInteger(value) || value < 0) throw new Malformed('a number that should count something')
  return value
}

function positive(value: number): number {
  if (!Number.isFinite(value) || value < 0) throw new Malformed('seconds that are no time')
  return value
}
