// The border of what a plug-in declares about making and using: schemas, and the refusals that name the field.
// After this the types of types.ts can be trusted.

import { z } from 'zod'
import { foundText } from '../encodings.js'
import { limits } from '../limits.js'
import { refuse } from '../refusals.js'
import {
  batteryKinds,
  energySources,
  makingMethods,
  noMachine,
  type Process,
  places,
  wettings,
} from './types.js'

const name = z.string().min(1).max(limits.nameLength)
const source = z.string().min(1)
const positive = z.number().positive()
const amount = z.number().nonnegative()
const share = z.number().min(0).max(1)
const envelope = z.array(positive).min(2).max(3)

const material = z.strictObject({
  name,
  youngPa: positive,
  youngSpread: share,
  poissonRatio: z.number().gt(-1).max(0.5),
  densityKgpm3: positive,
  strainMost: positive,
  stressMostPa: positive.optional(),
  relaxationSeconds: amount,
  source,
})

const stockRow = z.strictObject({
  name,
  form: z.enum(['tube', 'square-tube', 'rod', 'wire', 'strip', 'sheet', 'moulded']),
  material,
  widthM: positive.optional(),
  wallM: positive,
  areaM2: positive,
  lengthLeastM: positive,
  lengthMostM: positive,
  wallToleranceM: amount,
  source,
})

const actuatorClass = z.strictObject({
  name,
  kind: z.enum(['fluidic muscle', 'bellows', 'shape-memory wire', 'geared motor']),
  motion: z.enum(['linear', 'rotary']),
  forceMost: positive,
  strokeMost: positive.optional(),
  rateMostPerSecond: positive,
  powerMost: positive,
  dutyMost: share,
  pulls: z.boolean(),
  pushes: z.boolean(),
  lengthLeastM: amount,
  lengthMostM: amount,
  massKgpm: amount,
  fittingKg: amount,
  gasPressurePa: amount,
  voltageV: amount,
  hottestC: z.number(),
  source,
})

/** The second of two rows with one name would never be found. */
function twice(rows: readonly { readonly name: string }[]): boolean {
  return new Set(rows.map((row) => row.name)).size < rows.length
}

const processSchema = z.strictObject({
  name,
  methods: z.array(z.enum(makingMethods)),
  stock: z
    .array(stockRow)
    .max(limits.optionsMost)
    .refine((rows) => !twice(rows), 'expected rows with different names')
    .refine(
      (rows) => rows.every((row) => row.lengthLeastM <= row.lengthMostM),
      'expected lengthLeastM up to lengthMostM in every row',
    ),
  actuators: z
    .array(actuatorClass)
    .max(limits.optionsMost)
    .refine((rows) => !twice(rows), 'expected classes with different names'),
  wallLeastM: positive.optional(),
  gapLeastM: positive.optional(),
  envelopeM: envelope.optional(),
  massMostKg: positive.optional(),
})

const useSchema = z.strictObject({
  places: z.array(z.enum(places)).optional(),
  wetted: z.enum(wettings).optional(),
  energy: z.array(z.enum(energySources)).optional(),
  gasPressurePa: amount.optional(),
  gasVolumeM3: amount.optional(),
  liquidPressurePa: amount.optional(),
  storedElasticJ: amount.optional(),
  suspendedKg: amount.optional(),
  suspendedHeightM: amount.optional(),
  movingParts: z.boolean().optional(),
  peakForceN: amount.optional(),
  rotationHz: amount.optional(),
  voltageV: amount.optional(),
  battery: z.enum(batteryKinds).optional(),
  hottestC: z.number().min(-273.15).optional(),
  massKg: amount.optional(),
  onRunningMachine: z.boolean().optional(),
  vibrationHz: amount.optional(),
  upstreamOfPump: z.boolean().optional(),
})

const partName = z.string().min(1).max(200)
const thickness = z.strictObject({ name: partName, thicknessM: z.number() })
const partsSchema = z.strictObject({
  struts: z.array(z.strictObject({ name: partName, stock: z.string(), lengthM: z.number() })).optional(),
  actuators: z
    .array(
      z.strictObject({
        name: partName,
        class: z.string(),
        lengthM: z.number().optional(),
        stroke: z.number().optional(),
        ratePerSecond: z.number().optional(),
        force: z.number().optional(),
        power: z.number().optional(),
        duty: z.number().optional(),
      }),
    )
    .optional(),
  walls: z.array(thickness).optional(),
  gaps: z.array(thickness).optional(),
  envelopeM: z.array(z.number()).min(2).max(3).optional(),
  massKg: z.number().optional(),
})

/** '[0].lengthM' of ['stock', 0, 'lengthM'], after the name of the field. */
function pathText(path: readonly PropertyKey[]): string {
  return path.map((step) => (typeof step === 'number' ? `[${step}]` : `.${String(step)}`)).join('')
}

function valueAt(value: unknown, path: readonly PropertyKey[]): unknown {
  let at = value
  for (const step of path) {
    if (typeof at !== 'object' || at === null) return undefined
    at = (at as { readonly [step: PropertyKey]: unknown })[step]
  }
  return at
}

/** One sentence on the first thing wrong with `value`, or nothing. */
function fault(
  schema: z.ZodType,
  value: unknown,
  field: string,
): { readonly field: string; readonly isMissing: boolean; readonly detail: string } | undefined {
  const read = schema.safeParse(value)
  const issue = read.error?.issues[0]
  if (!issue) return undefined
  const at = `${field}${pathText(issue.path)}`
  const there = valueAt(value, issue.path)
  const found = there === undefined ? 'nothing' : foundText(there)
  return { field: at, isMissing: there === undefined, detail: `${at}: found ${found}. ${issue.message}.` }
}

function demandShape(schema: z.ZodType, value: unknown, field: string): void {
  const found = fault(schema, value, field)
  if (!found) return
  throw refuse(found.isMissing ? 'missing-field' : 'impossible-value', {
    detail: found.detail,
    where: { field: found.field },
    cure: `Mend the field \`${found.field}\` of the problem; shared/making/types.ts says what every field means.`,
  })
}

/** Refuses, naming the field, what is neither nothing nor a process. */
export function checkProcess(value: unknown, field: string): asserts value is Process | undefined {
  if (value !== undefined) demandShape(processSchema, value, field)
}

/** Refuses what is neither nothing, a use, 'no-machine' nor a function (whose answers useFault() looks at). */
export function checkUse(value: unknown, field: string): void {
  if (value === undefined || value === noMachine || typeof value === 'function') return
  demandShape(useSchema, value, field)
}

/** What is wrong with a use that a problem's function gave, in one sentence; nothing when it is sound. */
export function useFault(value: unknown): string | undefined {
  return fault(useSchema, value, 'use')?.detail
}

/** What is wrong with the parts that a problem listed, in one sentence; nothing when they are sound. */
export function partsFault(value: unknown): string | undefined {
  return fault(partsSchema, value, 'parts')?.detail
}
