// `npm run bench`: builds, compiles the benchmarks beside the program (dist/tests/, never packed) so that they
// measure the emitted files, and runs tests/bench/main.ts with the words given.

import { spawnSync } from 'node:child_process'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { build } from './build.mjs'

const root = join(dirname(fileURLToPath(import.meta.url)), '..', '..')
const run = (...args) => spawnSync(process.execPath, args, { cwd: root, stdio: 'inherit' }).status ?? 1

let status = build().status
if (status === 0) {
  console.log('bench: compiling the benchmarks')
  status = run(join('node_modules', 'typescript', 'bin', 'tsc'), '-p', join('tests', 'bench'))
}
if (status === 0) {
  status = run('--expose-gc', join('dist', 'tests', 'bench', 'main.js'), ...process.argv.slice(2))
}
process.exitCode = status
