// Importing a bundled plug-in, nothing more: threads and children do this with a bundle that was checked before.

import { pathToFileURL } from 'node:url'
import { type RefusalCode, type RefusalDetail, refusals, refuse, type Where } from '../../shared/refusals.js'

/** A bundle as text or as the file it is pinned in; never the author's own source file. */
export type PluginSource = { readonly code: string } | { readonly file: string }

/**
 * What a bundled plug-in exports as default, unchecked. Refuses: problem-not-found (no such bundle), problem-throws
 * (its top level threw), or what defineProblem refused in it. A module is loaded once in a thread; importing it again
 * gives the same object.
 */
export async function importPlugin(source: PluginSource): Promise<unknown> {
  const where = placeOf(source)
  try {
    const module: { readonly default?: unknown } = await import(/* @vite-ignore */ addressOf(source))
    return module.default
  } catch (error) {
    if (isMissing(error))
      throw refuse('problem-not-found', { detail: `${where.file} does not exist.`, where })
    if (isForeignRefusal(error)) throw refuse(error.code, { ...error, where: { ...where, ...error.where } })
    const text = error instanceof Error ? `${error.name}: ${error.message}` : String(error)
    throw refuse('problem-throws', { detail: `while it was loaded: ${text}`, where, cause: error })
  }
}

/** Where a bundle lies, as far as that is known. */
export function placeOf(source: PluginSource): Where {
  return 'file' in source ? { file: source.file } : {}
}

function addressOf(source: PluginSource): string {
  if ('file' in source) return pathToFileURL(source.file).href
  // The name keeps stack traces short: without it they would repeat the whole module.
  const code = `${source.code}\n//# sourceURL=plug-in.mjs\n`
  return `data:text/javascript;base64,${Buffer.from(code, 'utf8').toString('base64')}`
}

function isMissing(error: unknown): boolean {
  return error instanceof Error && 'code' in error && error.code === 'ERR_MODULE_NOT_FOUND'
}

/** A bundle has its own copy of the class Refusal: its refusals are known by their form. */
function isForeignRefusal(error: unknown): error is Error & RefusalDetail & { readonly code: RefusalCode } {
  return (
    error instanceof Error &&
    error.name === 'Refusal' &&
    'code' in error &&
    typeof error.code === 'string' &&
    error.code in refusals &&
    'detail' in error &&
    typeof error.detail === 'string'
  )
}
