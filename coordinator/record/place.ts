// Where a record may lie. SQLite's write-ahead log needs shared memory between all processes that open it, which
// network file systems do not give: two coordinators on two hosts would not see each other's locks.

import { statfsSync } from 'node:fs'
import { refuse } from '../../shared/refusals.js'

interface FileSystemRow {
  readonly name: string
  readonly verdict: 'refused' | 'doubtful'
}

/** Numbers of file systems that statfs(2) reports (linux/magic.h and the makers' sources; from memory). */
const fileSystems = new Map<number, FileSystemRow>([
  [0x6969, { name: 'NFS', verdict: 'refused' }],
  [0x517b, { name: 'SMB', verdict: 'refused' }],
  [0xfe534d42, { name: 'SMB', verdict: 'refused' }],
  [0xff534d42, { name: 'CIFS', verdict: 'refused' }],
  [0x5346414f, { name: 'AFS', verdict: 'refused' }],
  [0x0bd00bd0, { name: 'Lustre', verdict: 'refused' }],
  [0x47504653, { name: 'GPFS', verdict: 'refused' }],
  [0x19830326, { name: 'BeeGFS', verdict: 'refused' }],
  [0x00c36400, { name: 'Ceph', verdict: 'refused' }],
  [0x01021997, { name: '9P', verdict: 'doubtful' }],
  [0x65735546, { name: 'FUSE', verdict: 'doubtful' }],
])

/** Number of the file system of a folder; 0 where the system does not tell. */
export function fileSystemOf(folder: string): number {
  try {
    return statfsSync(folder).type >>> 0
  } catch {
    return 0
  }
}

/** A warning for a doubtful place, undefined for a good one. @throws Refusal 'network-file-system' */
export function judgePlace(folder: string, fileSystem: number, allowed: boolean): string | undefined {
  const row = fileSystems.get(fileSystem)
  if (!row) return undefined
  if (row.verdict === 'refused' && !allowed) {
    throw refuse('network-file-system', {
      detail: `the folder lies on ${row.name}, where file locks between machines cannot be relied on`,
      where: { file: folder },
    })
  }
  return `The record lies on ${row.name}: make sure that only this machine opens it.`
}
