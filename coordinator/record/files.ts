// Trouble with plain files beside the database, as refusals.

import { type Refusal, type RefusalCode, refuse } from '../../shared/refusals.js'

const codes: { readonly [code: string]: RefusalCode } = {
  ENOSPC: 'disk-full',
  EDQUOT: 'disk-full',
  EROFS: 'disk-read-only',
  EACCES: 'disk-read-only',
  EPERM: 'disk-read-only',
}

/** The refusal for an error of node:fs. */
export function fileTrouble(error: unknown, path: string): Refusal {
  const code = error instanceof Error && 'code' in error ? String(error.code) : ''
  const detail = error instanceof Error ? error.message : String(error)
  return refuse(codes[code] ?? 'disk-error', { detail, where: { file: path }, cause: error })
}
