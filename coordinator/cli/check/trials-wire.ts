// What `check` and its trial processes say to each other: JSON, doubles as base64 so that NaN and -0 survive.

import { z } from 'zod'
import type { TrialPlan } from './trials.js'

export interface TrialsOrder {
  /** File. */
  readonly bundle: string
  readonly plan: TrialPlan
}

export const failureList = z
  .array(z.strictObject({ simulation: z.number().int(), reason: z.string() }))
  .readonly()

const begin = z.strictObject({
  kind: z.literal('begin'),
  /** 0: loading. */
  machine: z.number().int(),
  run: z.number().int(),
})
const done = z.strictObject({
  kind: z.literal('done'),
  machines: z.array(
    z.strictObject({
      number: z.number().int(),
      /** Canonical bytes, base64. */
      genome: z.string(),
      expectedCost: z.number(),
      secondsPerSimulation: z.number(),
      /** Doubles, little-endian, base64. */
      values: z.string(),
      failures: failureList,
      faults: failureList,
    }),
  ),
  faults: z
    .array(
      z.strictObject({
        kind: z.enum(['wrong-results', 'not-deterministic', 'problem-throws', 'cannot-be-made']),
        sentence: z.string(),
      }),
    )
    .readonly(),
  failed: z.number().int(),
  simulations: z.number().int(),
  failedBecause: z.string().optional(),
  keptBytesPerSimulation: z.number().optional(),
  step: z
    .strictObject({
      machines: z.number().int(),
      simulations: z.number().int(),
      failedAtOne: z.number().int(),
      changes: z
        .array(
          z.strictObject({
            objective: z.string(),
            unit: z.string(),
            mean: z.number(),
            change: z.number(),
            largestChange: z.number(),
            bias: z.number(),
            spread: z.number().optional(),
          }),
        )
        .readonly(),
    })
    .optional(),
  /** Largest resident size of the trial process. */
  peakBytes: z.number(),
  /** Its resident size before the first simulation. */
  baseBytes: z.number(),
})
export const trialsLine = z.discriminatedUnion('kind', [begin, done])
export type TrialsLine = z.infer<typeof trialsLine>
export type TrialsDone = z.infer<typeof done>

export function packValues(values: Float64Array): string {
  const bytes = Buffer.alloc(8 * values.length)
  for (const [index, value] of values.entries()) bytes.writeDoubleLE(value, 8 * index)
  return bytes.toString('base64')
}

export function unpackValues(text: string): Float64Array {
  const bytes = Buffer.from(text, 'base64')
  return Float64Array.from({ length: bytes.length / 8 }, (_, index) => bytes.readDoubleLE(8 * index))
}
