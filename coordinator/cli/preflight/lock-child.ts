// Holds the write lock of a database in this process, and lets a second process try for it. Prints 'refused' when
// that one was refused, 'granted' when it was not.

import { execFileSync } from 'node:child_process'
import { fileURLToPath } from 'node:url'
import { sqliteStorage } from '../../record/storage.js'

const [, , path = '', second] = process.argv

const database = sqliteStorage.open(path, second === undefined ? 'create' : 'write')
if (second === undefined) {
  database.exec('PRAGMA journal_mode = DELETE; CREATE TABLE probe (one INTEGER) STRICT; BEGIN IMMEDIATE')
  const me = fileURLToPath(import.meta.url)
  process.stdout.write(execFileSync(process.execPath, [me, path, 'second'], { encoding: 'utf8' }))
  database.exec('ROLLBACK')
} else {
  process.stdout.write(tries() ? 'granted' : 'refused')
}
database.close()

function tries(): boolean {
  try {
    database.exec('PRAGMA busy_timeout = 200; BEGIN IMMEDIATE')
    return true
  } catch {
    return false
  }
}
