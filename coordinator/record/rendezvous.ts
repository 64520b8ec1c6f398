// Writes where the coordinator's Redis is into the record's folder, so that workers find it and follow it when it
// moves. Whoever reads sees the old file or the new one, never half of one.

import { closeSync, fsyncSync, openSync, renameSync, rmSync, writeSync } from 'node:fs'
import { join } from 'node:path'
import { type Rendezvous, rendezvousFile } from '../../shared/cluster/rendezvous.js'
import { fileTrouble } from './files.js'

const ownerOnly = 0o600

/** @throws Refusal when the folder cannot be written */
export function writeRendezvous(folder: string, rendezvous: Rendezvous): void {
  const path = join(folder, rendezvousFile)
  const temporary = `${path}.${rendezvous.pid}.new`
  try {
    const file = openSync(temporary, 'w', ownerOnly)
    try {
      writeSync(file, `${JSON.stringify(rendezvous, undefined, 2)}\n`)
      fsyncSync(file)
    } finally {
      closeSync(file)
    }
    renameSync(temporary, path)
  } catch (error) {
    rmSync(temporary, { force: true })
    throw fileTrouble(error, path)
  }
}
