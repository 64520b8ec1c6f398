// What the rest of the house uses of the record.

export { mayTryAgain } from './guard.js'
export type { Holder, HolderSeen, ProcessIdentity, Takeover } from './holder.js'
export { isRunning, nameHolder, thisProcess } from './holder.js'
export {
  type Loss,
  type OpenOptions,
  type OpenRecord,
  openRecord,
  type ReadOnlyRecord,
  readRecord,
  recordFolder,
  recordVersion,
  verifyRecord,
  watchHolder,
} from './open.js'
export { type Pinned, type SearchIdentity, sha256Hex } from './pinned.js'
export type { StoredReader, Totals } from './reader.js'
export {
  copyShared,
  isShared,
  openShared,
  type SharedPlace,
  sharedHolder,
  watchSharedHolder,
  workCopyOf,
} from './shared-folder/open.js'
export type { DamagedAppend, Verification } from './verify.js'
