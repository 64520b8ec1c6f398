// `npm test`: runs the phases in order, shows how long each took, adds up, and closes with one line
// `N passed, N failed` (', N skipped' or ', N not run: needs ...' may follow). Nothing is skipped silently.

import { spawnSync } from 'node:child_process'
import { existsSync, mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { parseArgs } from 'node:util'
import { phases, sizes } from './phases.mjs'
import { cures, findService, services, systemWorld } from './services.mjs'

const root = join(dirname(fileURLToPath(import.meta.url)), '..', '..')
const vitest = join('node_modules', 'vitest', 'vitest.mjs')

const help = `npm test -- [--only PHASE[,PHASE]] [--without SERVICE[,SERVICE]] [--list]

  --only       run these phases only: ${phases.map((phase) => phase.name).join(', ')}
  --without    knowingly leave out what needs a service: ${Object.keys(services).join(', ')}
  --list       name the phases and end

Sizes come from the environment: ${Object.entries(sizes)
  .map(([name, usual]) => `${name} (${usual})`)
  .join(', ')}.
Services: ${Object.entries(services)
  .map(([name, row]) => `${name} through ${row.variable}`)
  .join(', ')}.`

/** The words of the command line, checked; ends the process with 64 when they are wrong. */
function readOptions() {
  const stop = (text) => {
    console.error(`npm test: ${text}\n\n${help}`)
    process.exit(64)
  }
  const list = (text) => (text ?? '').split(',').filter((word) => word !== '')
  const options = {
    only: { type: 'string' },
    without: { type: 'string', multiple: true },
    list: { type: 'boolean' },
    help: { type: 'boolean' },
  }
  let values
  try {
    values = parseArgs({ options }).values
  } catch (error) {
    return stop(error.message)
  }
  const only = list(values.only)
  const without = (values.without ?? []).flatMap(list)
  const names = phases.map((phase) => phase.name)
  for (const name of only) if (!names.includes(name)) stop(`there is no phase '${name}'`)
  for (const name of without) if (!(name in services)) stop(`there is no service '${name}'`)
  return { only, without, list: values.list, help: values.help }
}

const seconds = (sinceMs) => `${((Date.now() - sinceMs) / 1000).toFixed(1)} s`

function run(args, env) {
  return spawnSync(process.execPath, args, { cwd: root, stdio: ['ignore', 'inherit', 'inherit'], env }).status
}

/** Runs checks that are no vitest files; each counts as one test. */
function runCommands(phase, env) {
  const counts = { passed: 0, failed: [], skipped: [] }
  for (const command of phase.commands) {
    if (run(command.args, env) === 0) counts.passed += 1
    else counts.failed.push(`${phase.name} > ${command.name}`)
  }
  return counts
}

function runProject(phase, env, scratch) {
  const file = join(scratch, `${phase.name}.json`)
  const reporters = ['--reporter=default', '--reporter=./tests/tools/count-reporter.mjs']
  const args = [
    vitest,
    'run',
    '--project',
    phase.project,
    '--silent=passed-only',
    '--passWithNoTests',
    ...reporters,
  ]
  const status = run(args, { ...env, SKERRY_TEST_COUNTS: file })
  if (!existsSync(file))
    return {
      passed: 0,
      failed: [`${phase.name} > vitest ended with ${status} before its report`],
      skipped: [],
    }
  const counts = JSON.parse(readFileSync(file, 'utf8'))
  if (status !== 0 && counts.failed.length === 0)
    counts.failed.push(`${phase.name} > vitest ended with ${status}`)
  return counts
}

/** Names of a phase's tests without running them. */
function listProject(phase, env) {
  const args = [vitest, 'list', '--project', phase.project, '--json']
  const done = spawnSync(process.execPath, args, { cwd: root, encoding: 'utf8', env })
  return JSON.parse(done.stdout).map((test) => `${test.file.slice(root.length + 1)} > ${test.name}`)
}

/** Finds what a phase needs; puts the paths where its tests look, and names what is missing. */
function findNeeds(phase, env, without) {
  const missing = []
  for (const name of phase.needs ?? []) {
    if (without.includes(name)) {
      missing.push(name)
      continue
    }
    const found = findService(name, systemWorld())
    if (found === undefined) missing.push(name)
    else env[services[name].variable] = found
  }
  return missing
}

/** Puts the paths of what a phase only wants where its tests look; they skip, with the reason, what is not there. */
function findWants(phase, env, without) {
  for (const name of phase.wants ?? []) {
    const found = without.includes(name) ? undefined : findService(name, systemWorld())
    env[services[name].variable] = found ?? ''
  }
}

function addUp(total, counts) {
  total.passed += counts.passed
  total.failed.push(...counts.failed)
  total.skipped.push(...counts.skipped)
}

function runPhase(phase, env, scratch, without, total) {
  const names = phase.needs ? listProject(phase, env) : []
  if (phase.needs && names.length === 0) return 'no tests'
  const missing = findNeeds(phase, env, without)
  findWants(phase, env, without)
  if (missing.length === 0) {
    const counts = phase.commands ? runCommands(phase, env) : runProject(phase, env, scratch)
    addUp(total, counts)
    return `${counts.passed} passed, ${counts.failed.length} failed, ${counts.skipped.length} skipped`
  }
  const accepted = missing.every((name) => without.includes(name))
  if (accepted)
    total.skipped.push(...names.map((name) => ({ name, note: `--without ${missing.join(', ')}` })))
  else total.notRun.push({ names, missing: missing.filter((name) => !without.includes(name)) })
  return `${names.length} ${accepted ? 'skipped' : 'not run'}, for want of ${missing.join(', ')}`
}

/** The list of what did not pass, then the one closing line. Returns the exit code. */
function report(total) {
  for (const name of total.failed) console.log(`failed: ${name}`)
  for (const { name, note } of total.skipped) console.log(`skipped: ${name} (${note})`)
  for (const { names, missing } of total.notRun) {
    for (const name of names) console.log(`not run: ${name} (needs ${missing.join(', ')})`)
  }
  const notRun = total.notRun.flatMap(({ names }) => names).length
  const missing = [...new Set(total.notRun.flatMap((group) => group.missing))]
  for (const name of missing) for (const line of cures(name)) console.log(line)
  let line = `${total.passed} passed, ${total.failed.length} failed`
  if (total.skipped.length > 0) line += `, ${total.skipped.length} skipped`
  if (notRun > 0) line += `, ${notRun} not run: needs ${missing.join(', ')}`
  console.log(`\n${line}`)
  return total.failed.length > 0 || notRun > 0 || total.passed === 0 ? 1 : 0
}

function main() {
  const options = readOptions()
  if (options.help || options.list) {
    console.log(
      options.help ? help : phases.map((phase) => `${phase.name.padEnd(9)} ${phase.says}`).join('\n'),
    )
    return 0
  }
  const chosen = phases.filter((phase) => options.only.length === 0 || options.only.includes(phase.name))
  const env = { ...sizes, ...process.env }
  const total = { passed: 0, failed: [], skipped: [], notRun: [] }
  const scratch = mkdtempSync(join(tmpdir(), 'skerry-tests-'))
  const lines = []
  for (const [place, phase] of chosen.entries()) {
    const sinceMs = Date.now()
    console.log(`\n=== phase ${place + 1} of ${chosen.length}: ${phase.name} (${phase.says})`)
    const line = `${phase.name.padEnd(9)} ${runPhase(phase, env, scratch, options.without, total)} in ${seconds(sinceMs)}`
    console.log(`=== ${line}`)
    lines.push(line)
    if (phase.name === 'build' && total.failed.length > 0) break
  }
  rmSync(scratch, { recursive: true, force: true })
  console.log(`\n${lines.join('\n')}\n`)
  return report(total)
}

process.exitCode = main()
