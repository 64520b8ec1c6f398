#!/usr/bin/env node
// The program: gives the commands a terminal, signals and an exit code. Everything else is in table.ts.

import { readFileSync } from 'node:fs'
import { constants } from 'node:os'
import { join } from 'node:path'
import { emittedRoot } from '../../worker/entry.js'
import { spareHelpersOfCoordinator } from '../../worker/thrift.js'
import type { Output } from './command.js'
import { runCommandLine } from './table.js'

spareHelpersOfCoordinator()

// Standard output is the program's own: what a problem prints where it is loaded here goes to standard error.
console.log = console.info = console.debug = console.error

const stopping = new AbortController()
let signals = 0
// SIGUSR1 is what batch systems send some time before they end a job.
for (const name of ['SIGINT', 'SIGTERM', 'SIGUSR1'] as const) {
  process.on(name, () => {
    signals += 1
    stopping.abort()
    // Whoever asks a second time means it; the record survives that too.
    if (signals > 1) process.exit(128 + constants.signals[name])
  })
}
// A reader that went away (a closed pager) is no error of ours.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code === 'EPIPE') process.exit(0)
  throw error
})

function processOutput(json: boolean): Output {
  const { env, stdout, stderr } = process
  const isTerminal = stdout.isTTY === true && env.TERM !== 'dumb'
  const locale = env.LC_ALL || env.LC_CTYPE || env.LANG || ''
  return {
    json,
    isTerminal,
    get columns() {
      return stdout.columns ?? 100
    },
    unicode: /utf-?8/i.test(locale),
    print: (text) => void stdout.write(`${text}\n`),
    note: (text) => void stderr.write(`${text}\n`),
    raw: (text) => void stdout.write(text),
    signal: stopping.signal,
  }
}

const packageFile = join(emittedRoot, '..', 'package.json')
const { version } = JSON.parse(readFileSync(packageFile, 'utf8')) as { readonly version: string }
process.exitCode = await runCommandLine(process.argv.slice(2), version, processOutput)
