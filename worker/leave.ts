// How a child process of ours ends when its parent is gone.

import { rmdirSync } from 'node:fs'

/** Ends this process. The folder made for it goes too, as nobody else removes it then; rmdir takes only an empty one. */
export function leaveWithFolder(): never {
  try {
    rmdirSync(process.cwd())
  } catch {
    // Not empty, or gone already: it stays as it is.
  }
  process.exit(0)
}
