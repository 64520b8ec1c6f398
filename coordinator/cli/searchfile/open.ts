// From the path of a search file to everything a search needs: the checked plan, the bundled plug-in and the loaded problem.
// Refuses with everything that is wrong at once.

import { readFileSync } from 'node:fs'
import { dirname, resolve } from 'node:path'
import { check } from '../../../shared/check.js'
import { randomGenome } from '../../../shared/encodings.js'
import type { AnyProblem } from '../../../shared/problem.js'
import { Refusal, refuse } from '../../../shared/refusals.js'
import { stream } from '../../../shared/streams.js'
import { problemPlan } from '../../../sim/problem.js'
import { bundleBuiltIn, bundlePlugin, isBuiltIn, type PluginBundle } from '../../../worker/plugin/bundle.js'
import { loadPlugin } from '../../../worker/plugin/load.js'
import type { SearchPlan } from '../../evolution/plan.js'
import { type Finding, refusalOf } from './finding.js'
import { planSearch, type ReadFile, readSearchFile } from './read.js'
import type { SearchFile } from './schema.js'
import type { SearchTables } from './tables.js'
import { tryLoad } from './try-load.js'

export interface OpenedSearch {
  readonly file: string
  readonly text: string
  /** As written, with defaults: for the fields that are no part of the plan (cores, port, workersExpected). */
  readonly fields: SearchFile
  readonly plan: SearchPlan
  readonly warnings: readonly Finding[]
  readonly bundle: PluginBundle
  readonly problem: AnyProblem
  /** Mean expected cost of a founder's evaluation, in units of island time. */
  readonly meanCost: number
}

/** Reads, bundles, loads and plans. Refusals: those of the table under "Search file" and "Problem". */
export async function openSearch(file: string, tables: SearchTables, nowMs?: number): Promise<OpenedSearch> {
  const text = readText(file)
  const read = readSearchFile(text, tables)
  const loaded = await loadProblem(file, read)
  const found = loaded instanceof Refusal ? undefined : loaded
  const { plan, findings } = planSearch(
    read,
    found && problemPlan(found.problem, found.bundle.digest),
    tables,
    { ...(nowMs === undefined ? {} : { nowMs }), ...(found ? { meanCost: meanCostOf(found.problem) } : {}) },
  )
  const refused = findings.filter(({ severity }) => severity === 'refused')
  if (loaded instanceof Refusal) {
    throw refused.length === 0 ? loaded : refusalOf(file, [...refused, findingOf(loaded, read)])!
  }
  if (refused.length > 0) throw refusalOf(file, refused)!
  check(
    found !== undefined && plan !== undefined && read.file !== undefined,
    'a search without a plan has a reason',
  )
  const meanCost = meanCostOf(found.problem)
  return { file, text, fields: read.file, plan, warnings: findings, meanCost, ...found }
}

/** A problem that could not be loaded, among other mistakes of the file that names it. */
function findingOf(refusal: Refusal, read: ReadFile): Finding {
  return {
    severity: 'refused',
    code: refusal.code,
    place: read.located.placeOf(['problem']),
    field: 'problem',
    found: refusal.detail,
    expected: 'a problem that can be loaded',
    advice: refusal.cure,
  }
}

/** The name a search file gives, where it can be read at all: what is wrong with it is for openSearch to say. */
export function peekName(file: string, tables: SearchTables): string | undefined {
  try {
    return readSearchFile(readText(file), tables).partial.name
  } catch {
    return undefined
  }
}

function readText(file: string): string {
  try {
    return readFileSync(file, 'utf8')
  } catch (error) {
    const code = error instanceof Error && 'code' in error ? String(error.code) : String(error)
    if (code === 'ENOENT')
      throw refuse('file-not-found', { detail: `there is no file ${file}.`, where: { file } })
    const why = code === 'EISDIR' ? `${file} is a folder` : `${file}: ${code}`
    throw refuse('file-unreadable', { detail: `${why}.`, where: { file } })
  }
}

/** The problem, or why there is none; undefined when the file does not name one. */
async function loadProblem(
  file: string,
  read: ReadFile,
): Promise<{ bundle: PluginBundle; problem: AnyProblem } | Refusal | undefined> {
  const path = read.partial.problem
  if (path === undefined) return undefined
  const plugin = isBuiltIn(path) ? path : resolve(dirname(file), path)
  try {
    const bundle = await (isBuiltIn(path) ? bundleBuiltIn(path) : bundlePlugin(plugin))
    await tryLoad(bundle.code)
    return { bundle, problem: await loadPlugin({ code: bundle.code }) }
  } catch (error) {
    if (!(error instanceof Refusal)) throw error
    if (error.code !== 'problem-not-found') return atPlugin(error, plugin)
    const where = { file, ...read.located.placeOf(['problem']), field: 'problem' }
    return refuse(error.code, { detail: error.detail, where, cure: error.cure, cause: error })
  }
}

const founderSample = 64

/**
 * Mean expected cost of an evaluation of founders, which tells how long a round is; 1 where it cannot be asked. Always the
 * same sample: warnings do not depend on the seed.
 */
export function meanCostOf(problem: AnyProblem): number {
  try {
    let sum = 0
    for (let founder = 0; founder < founderSample; founder++) {
      sum += problem.expectedCost(
        problem.repair(randomGenome(problem.genome, stream(0, 'check', 3, founder))),
      )
    }
    const mean = sum / founderSample
    return mean >= 1 && Number.isFinite(mean) ? mean : 1
  } catch {
    // check and run say what it throws.
    return 1
  }
}

/** A refusal that does not know its file was about this plug-in. */
function atPlugin(error: Refusal, plugin: string): Refusal {
  const where = { file: plugin, ...error.where }
  return refuse(error.code, { detail: error.detail, where, cure: error.cure, cause: error })
}
