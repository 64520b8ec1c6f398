// What of a machine cannot be made by a process, part by part and rule by rule. One row of `rules` a rule; every
// comparison is written so that NaN breaks the rule.

import type { ActuatorClass, ActuatorPart, Parts, Process, StrutPart, Thickness } from './types.js'

export interface MakingFault {
  /** 'upper chord 3', 'the whole machine' */
  readonly part: string
  /** 'length of stock', 'least wall', ... */
  readonly rule: string
  /** What was found and what was expected, for a person. */
  readonly detail: string
}

const whole = 'the whole machine'

/** Relative room for rounding: a part that repair put exactly onto a limit passes. */
const room = 1e-9
const atLeast = (value: number, least: number) => value >= least * (1 - room)
const atMost = (value: number, most: number) => value <= most * (1 + room)

type Rule = (process: Process, parts: Parts) => readonly MakingFault[]

/** Everything of `parts` that `process` cannot make, in the order of rules and parts; empty: it can be made. */
export function makingFaults(process: Process, parts: Parts): readonly MakingFault[] {
  return rules.flatMap((rule) => rule(process, parts))
}

/** 'upper chord 3: length of stock: found 4.0 mm, expected 20.0 mm to 2.00 m' */
export function makingFaultText({ part, rule, detail }: MakingFault): string {
  return `${part}: ${rule}: ${detail}`
}

const rules: readonly Rule[] = [
  (process, { struts = [] }) => struts.flatMap((part) => strutFaults(process, part)),
  (process, { actuators = [] }) => actuators.flatMap((part) => actuatorFaults(process, part)),
  ({ wallLeastM }, { walls }) => thinner('least wall', walls, wallLeastM),
  ({ gapLeastM }, { gaps }) => thinner('least gap', gaps, gapLeastM),
  ({ envelopeM }, parts) => envelopeFaults(envelopeM, parts.envelopeM),
  ({ massMostKg }, { massKg }) =>
    massMostKg === undefined || massKg === undefined || atMost(massKg, massMostKg)
      ? []
      : [
          {
            part: whole,
            rule: 'largest mass',
            detail: `found ${short(massKg)} kg, expected at most ${short(massMostKg)} kg`,
          },
        ],
]

function strutFaults(process: Process, { name: part, stock, lengthM }: StrutPart): readonly MakingFault[] {
  const row = process.stock.find((one) => one.name === stock)
  if (!row) {
    const names = process.stock.map((one) => one.name).join(', ')
    return [{ part, rule: 'row of stock', detail: `found '${stock}', expected one of ${names || 'none'}` }]
  }
  if (atLeast(lengthM, row.lengthLeastM) && atMost(lengthM, row.lengthMostM)) return []
  const expected = `${lengthText(row.lengthLeastM)} to ${lengthText(row.lengthMostM)} of ${row.name}`
  return [{ part, rule: 'length of stock', detail: `found ${lengthText(lengthM)}, expected ${expected}` }]
}

/** Fields of an actuator part with the limit of its class; a limit of nothing is none. */
const actuatorLimits: readonly {
  readonly rule: string
  readonly field: 'stroke' | 'ratePerSecond' | 'force' | 'power' | 'duty'
  readonly most: (row: ActuatorClass) => number | undefined
  readonly unit: (row: ActuatorClass) => string
}[] = [
  {
    rule: 'stroke of the actuator',
    field: 'stroke',
    most: (row) => row.strokeMost,
    unit: (row) => (row.motion === 'linear' ? 'of the length' : 'rad'),
  },
  {
    rule: 'rate of the actuator',
    field: 'ratePerSecond',
    most: (row) => row.rateMostPerSecond,
    unit: (row) => (row.motion === 'linear' ? '1/s' : 'rad/s'),
  },
  {
    rule: 'force of the actuator',
    field: 'force',
    most: (row) => row.forceMost,
    unit: (row) => (row.motion === 'linear' ? 'N' : 'N m'),
  },
  {
    rule: 'power of the actuator',
    field: 'power',
    most: (row) => row.powerMost,
    unit: (row) => (row.motion === 'linear' ? 'W/m' : 'W'),
  },
  { rule: 'duty of the actuator', field: 'duty', most: (row) => row.dutyMost, unit: () => 'of the time' },
]

function actuatorFaults(process: Process, actuator: ActuatorPart): readonly MakingFault[] {
  const { name: part, lengthM } = actuator
  const row = process.actuators.find((one) => one.name === actuator.class)
  if (!row) {
    const names = process.actuators.map((one) => one.name).join(', ')
    return [
      {
        part,
        rule: 'actuator class',
        detail: `found '${actuator.class}', expected one of ${names || 'none'}`,
      },
    ]
  }
  const faults: MakingFault[] = []
  if (lengthM !== undefined && !(atLeast(lengthM, row.lengthLeastM) && atMost(lengthM, row.lengthMostM))) {
    const expected = `${lengthText(row.lengthLeastM)} to ${lengthText(row.lengthMostM)} of ${row.name}`
    faults.push({
      part,
      rule: 'length of the actuator',
      detail: `found ${lengthText(lengthM)}, expected ${expected}`,
    })
  }
  for (const { rule, field, most, unit } of actuatorLimits) {
    const value = actuator[field]
    const limit = most(row)
    if (value === undefined || limit === undefined || atMost(value, limit)) continue
    const detail = `found ${short(value)} ${unit(row)}, expected at most ${short(limit)} ${unit(row)} of ${row.name}`
    faults.push({ part, rule, detail })
  }
  return faults
}

function thinner(
  rule: string,
  found: readonly Thickness[] | undefined,
  least: number | undefined,
): readonly MakingFault[] {
  if (found === undefined || least === undefined) return []
  return found
    .filter(({ thicknessM }) => !atLeast(thicknessM, least))
    .map(({ name, thicknessM }) => ({
      part: name,
      rule,
      detail: `found ${lengthText(thicknessM)}, expected at least ${lengthText(least)}`,
    }))
}

/** Sides may be turned: the longest is held against the longest. A missing third side is no limit. */
function envelopeFaults(
  most: readonly number[] | undefined,
  found: readonly number[] | undefined,
): readonly MakingFault[] {
  if (most === undefined || found === undefined) return []
  const falling = (sides: readonly number[]) => [...sides].sort((a, b) => b - a)
  const limits = falling(most)
  const sides = falling(found).slice(0, limits.length)
  if (!found.some(Number.isNaN) && sides.every((side, i) => atMost(side, limits[i]!))) return []
  const text = (box: readonly number[]) => box.map(lengthText).join(' by ')
  return [{ part: whole, rule: 'envelope', detail: `found ${text(found)}, expected at most ${text(most)}` }]
}

/** '12.3 mm', '2.50 m' */
export function lengthText(metres: number): string {
  return metres < 1 ? `${short(metres * 1000)} mm` : `${short(metres)} m`
}

/** Three significant digits. */
export function short(value: number): string {
  return String(Number(value.toPrecision(3)))
}
