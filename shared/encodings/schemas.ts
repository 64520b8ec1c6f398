// The shape of each encoding's specification as a plug-in gives it. Apart from the rows, because whoever only simulates
// needs no schemas, and loading zod costs more CPU than a thousand cheap simulations.

import { z } from 'zod'
import type { Encoding } from '../genome.js'
import { limits } from '../limits.js'

const lengthSchema = z.int().min(1).max(limits.genomeSlots)
const unitSchema = z.string().max(limits.nameLength).optional()
const int32 = z.int32()
const optionsSchema = z
  .array(z.string().min(1).max(limits.optionLength))
  .min(2)
  .max(limits.optionsMost)
  .refine((options) => new Set(options).size === options.length, { error: 'expected options that differ' })

export const encodingSchemas: { readonly [kind in Encoding['kind']]: z.ZodType } = {
  real: z.strictObject({
    kind: z.literal('real'),
    length: lengthSchema,
    low: z.number(),
    high: z.number(),
    scale: z.enum(['linear', 'log']),
    unit: unitSchema,
  }),
  integer: z.strictObject({
    kind: z.literal('integer'),
    length: lengthSchema,
    low: int32,
    high: int32,
    unit: unitSchema,
  }),
  choice: z.strictObject({ kind: z.literal('choice'), length: lengthSchema, options: optionsSchema }),
  bits: z.strictObject({ kind: z.literal('bits'), length: lengthSchema }),
  layout: z.strictObject({
    kind: z.literal('layout'),
    size: z.array(lengthSchema).min(1).max(limits.layoutAxes),
    options: optionsSchema,
  }),
}
