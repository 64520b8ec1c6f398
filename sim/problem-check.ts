// Is this a problem? One row a field; every row says what it expects. Used on what authors write and again on
// what a bundle exports.

import { checkSpec } from '../shared/genome-check.js'
import { limits } from '../shared/limits.js'
import { checkProcess, checkUse } from '../shared/making/declare.js'
import type { AnyProblem } from '../shared/problem.js'
import { type RefusalCode, refuse } from '../shared/refusals.js'

type Bag = { readonly [field: string]: unknown }

const identifier = /^[A-Za-z][A-Za-z0-9_]*$/
/** Names of problems and cases may have hyphens: they are file names and words, never fields. */
const word = /^[A-Za-z][A-Za-z0-9_-]*$/

function found(value: unknown): string {
  if (value === undefined) return 'nothing'
  if (typeof value === 'function') return 'a function'
  if (typeof value === 'number') return String(value)
  const text = JSON.stringify(value) ?? String(value)
  return text.length > 80 ? `${text.slice(0, 77)}...` : text
}

function demand(truth: boolean, field: string, value: unknown, expected: string): asserts truth {
  if (truth) return
  const code: RefusalCode = value === undefined ? 'missing-field' : 'impossible-value'
  throw refuse(code, {
    detail: `${field}: found ${found(value)}, expected ${expected}.`,
    where: { field },
    cure: `Mend the field \`${field}\` of the problem.`,
  })
}

const isBag = (value: unknown): value is Bag =>
  typeof value === 'object' && value !== null && !Array.isArray(value) && !ArrayBuffer.isView(value)
const isText = (value: unknown, most: number): value is string =>
  typeof value === 'string' && value.length > 0 && value.length <= most
const isNumber = (value: unknown): value is number => typeof value === 'number' && Number.isFinite(value)
const isOneOf = (value: unknown, options: readonly string[]) =>
  typeof value === 'string' && options.includes(value)

/** Throws a Refusal that names the field unless `value` is a whole problem. */
export function checkProblem(value: unknown): asserts value is AnyProblem {
  if (!isBag(value)) {
    throw refuse('not-a-problem', {
      detail: `the default export is ${found(value)}, expected the result of defineProblem({...}).`,
    })
  }
  for (const [field, check] of Object.entries(fields)) check(value[field], field)
  for (const field of Object.keys(value)) {
    demand(field in fields, field, value[field], `one of ${Object.keys(fields).join(', ')}`)
  }
  const measures = value.measures as Bag
  for (const name of Object.keys(value.objectives as Bag)) {
    demand(!(name in measures), `measures.${name}`, name, 'a name that no objective has')
  }
  checkTolerance(value)
}

/** Wanted where results may differ, for every number; refused where they may not. */
function checkTolerance({ exactness, tolerance, objectives, measures }: Bag): void {
  const field = 'tolerance'
  if (exactness !== 'tolerance' && exactness !== 'statistical') {
    demand(tolerance === undefined, field, tolerance, `nothing, because exactness is '${exactness}'`)
    return
  }
  const wanted = [...Object.keys(objectives as Bag), ...Object.keys(measures as Bag)]
  demand(isBag(tolerance), field, tolerance, 'an object with one entry for every objective and measure')
  for (const name of Object.keys(tolerance)) {
    demand(wanted.includes(name), `${field}.${name}`, name, `one of ${wanted.join(', ')}`)
  }
  for (const name of wanted) {
    const at = `${field}.${name}`
    const entry = tolerance[name]
    demand(isBag(entry), at, entry, '{ absolute } or { relative }, or both')
    const { absolute = 0, relative = 0, ...others } = entry
    demand(Object.keys(others).length === 0, at, entry, 'absolute and relative, nothing else')
    demand(isNumber(absolute) && absolute >= 0, `${at}.absolute`, absolute, 'a finite number from 0 on')
    demand(isNumber(relative) && relative >= 0 && relative < 1, `${at}.relative`, relative, '0 to below 1')
    demand(absolute > 0 || relative > 0, at, entry, 'an absolute or relative tolerance above 0')
  }
}

type FieldCheck = (value: unknown, field: string) => void

const aFunction: FieldCheck = (value, field) =>
  demand(typeof value === 'function', field, value, 'a function')
const perhapsAFunction: FieldCheck = (value, field) => {
  demand(value === undefined || typeof value === 'function', field, value, 'a function or nothing')
}
const aSentence: FieldCheck = (value, field) => demand(isText(value, 1_000), field, value, 'a text')

const fields: { readonly [field: string]: FieldCheck } = {
  name: (value, field) => {
    const sound = isText(value, limits.nameLength) && word.test(value)
    demand(sound, field, value, 'letters, digits, - and _, beginning with a letter')
  },
  version: (value, field) => demand(isText(value, limits.nameLength), field, value, "a text such as '1'"),
  summary: aSentence,
  genome: checkSpec,
  objectives: checkObjectives,
  measures: checkMeasures,
  cases: checkCases,
  exactness: (value, field) => {
    const options = ['bits', 'bits-per-processor', 'tolerance', 'statistical']
    demand(isOneOf(value, options), field, value, `one of ${options.join(', ')}`)
  },
  tolerance: (value, field) =>
    demand(value === undefined || isBag(value), field, value, 'an object or nothing'),
  drawCondition: aFunction,
  simulate: aFunction,
  simulateFiner: perhapsAFunction,
  needs: checkNeeds,
  expectedCost: aFunction,
  repair: aFunction,
  frames: perhapsAFunction,
  describe: perhapsAFunction,
  cautions: perhapsAFunction,
  process: checkProcess,
  parts: perhapsAFunction,
  use: checkUse,
}

const wholeUpTo = (value: unknown, most: number) =>
  Number.isSafeInteger(value) && (value as number) >= 1 && (value as number) <= most

/** One row a field of `needs`. */
const needRows: { readonly [name: string]: FieldCheck } = {
  cores: (value, field) => {
    const { threadsMost } = limits
    demand(value === undefined || wholeUpTo(value, threadsMost), field, value, `1 to ${threadsMost} cores`)
  },
  memoryMB: (value, field) => {
    const { megabytesMost } = limits
    const sound = value === undefined || wholeUpTo(value, megabytesMost)
    demand(sound, field, value, `1 to ${megabytesMost} megabytes, a whole number`)
  },
  tokens: (value, field) => {
    if (value === undefined) return
    demand(isBag(value), field, value, 'an object with one entry a licence')
    const names = Object.keys(value)
    demand(names.length <= limits.tokenKinds, field, `${names.length} kinds`, `at most ${limits.tokenKinds}`)
    for (const name of names) {
      const sound = isText(name, limits.nameLength) && word.test(name)
      demand(sound, `${field}.${name}`, name, 'letters, digits, - and _, beginning with a letter')
      const count = value[name]
      demand(wholeUpTo(count, limits.tokensMost), `${field}.${name}`, count, 'a whole number from 1')
    }
  },
}

function checkNeeds(value: unknown, field: string): void {
  if (value === undefined) return
  const names = Object.keys(needRows)
  demand(isBag(value), field, value, `an object with ${names.join(', ')}, or nothing`)
  for (const name of Object.keys(value)) {
    demand(Object.hasOwn(needRows, name), `${field}.${name}`, value[name], `one of ${names.join(', ')}`)
  }
  for (const [name, check] of Object.entries(needRows)) check(value[name], `${field}.${name}`)
}

function checkNames(value: unknown, field: string, least: number, most: number): asserts value is Bag {
  demand(isBag(value), field, value, 'an object with one entry a name')
  const names = Object.keys(value)
  demand(
    names.length >= least && names.length <= most,
    field,
    `${names.length} entries`,
    `${least} to ${most} entries`,
  )
  for (const name of names) {
    const sound = identifier.test(name) && name.length <= limits.nameLength
    demand(sound, `${field}.${name}`, name, 'a plain identifier (letters, digits, _)')
  }
}

function checkUnit(value: unknown, field: string): void {
  demand(isText(value, limits.nameLength), field, value, "a unit such as 'm' ('1' for a pure number)")
}

function checkObjectives(value: unknown, field: string): void {
  checkNames(value, field, 1, limits.objectivesMost)
  for (const [name, row] of Object.entries(value)) {
    const at = `${field}.${name}`
    demand(isBag(row), at, row, 'an object')
    const { direction, unit, reduce, overCases } = row
    demand(isOneOf(direction, ['maximise', 'minimise']), `${at}.direction`, direction, 'maximise or minimise')
    checkUnit(unit, `${at}.unit`)
    const quantile = isBag(reduce) ? reduce.quantile : undefined
    const sound =
      isOneOf(reduce, ['mean', 'median', 'worst']) || (isNumber(quantile) && quantile >= 0 && quantile <= 1)
    demand(sound, `${at}.reduce`, reduce, 'mean, median, worst or { quantile: 0 to 1 }')
    demand(isOneOf(overCases, ['mean', 'worst', 'sum']), `${at}.overCases`, overCases, 'mean, worst or sum')
  }
}

function checkMeasures(value: unknown, field: string): void {
  checkNames(value, field, 0, limits.measuresMost)
  for (const [name, row] of Object.entries(value)) {
    const at = `${field}.${name}`
    demand(isBag(row), at, row, 'an object')
    demand(isNumber(row.low), `${at}.low`, row.low, 'a finite number')
    demand(
      isNumber(row.high) && row.high > row.low,
      `${at}.high`,
      row.high,
      `a number above low (${row.low})`,
    )
    checkUnit(row.unit, `${at}.unit`)
  }
}

function checkCases(value: unknown, field: string): void {
  demand(Array.isArray(value), field, value, 'a list of names')
  demand(value.length <= limits.casesMost, field, `${value.length} cases`, `at most ${limits.casesMost}`)
  for (const [i, name] of value.entries()) {
    const at = `${field}[${i}]`
    const sound = isText(name, limits.nameLength) && word.test(name)
    demand(sound, at, name, 'letters, digits, - and _, beginning with a letter')
    demand(value.indexOf(name) === i, at, name, 'a name that no other case has')
  }
}
