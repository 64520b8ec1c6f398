import { describe, expect, it } from 'vitest'
import { check } from '../../shared/check.js'
import { refuse } from '../../shared/refusals.js'
import type { Command, Output } from './command.js'
import { commands, runCommandLine } from './table.js'

/** Runs a command line and listens. */
async function said(argv: readonly string[], rows?: readonly Command[]) {
  const out: string[] = []
  const notes: string[] = []
  const make = (json: boolean): Output => ({
    json,
    isTerminal: false,
    columns: 80,
    unicode: true,
    print: (text) => out.push(text),
    note: (text) => notes.push(text),
    raw: (text) => out.push(text),
    signal: new AbortController().signal,
  })
  const exitCode = await runCommandLine(argv, '1.2.3', make, rows)
  return { exitCode, out: out.join('\n'), notes: notes.join('\n') }
}
function probe(run: Command['run']): readonly Command[] {
  const options: Command['options'] = [
    { flag: '--stop-after', value: 'N', kind: 'count', help: 'a count' },
    { flag: '--record', value: 'DIR', kind: 'text', help: 'a text' },
    { flag: '--accept-changes', kind: 'switch', help: 'a switch' },
  ]
  return [
    {
      name: 'probe',
      summary: 'probes',
      arguments: [{ name: 'FILE', help: 'a file' }],
      options,
      examples: ['skerry probe x'],
      run,
    },
  ]
}

describe('the table of commands', () => {
  it('gives every command a help with an example that begins with its name, and every option a help', async () => {
    for (const command of commands) {
      const { exitCode, out } = await said([command.name, '--help'])
      expect(exitCode).toBe(0)
      expect(command.examples.length).toBeGreaterThan(0)
      for (const example of command.examples) {
        expect(example.startsWith(`skerry ${command.name}`)).toBe(true)
        expect(out).toContain(example)
      }
      for (const option of command.options) expect(out).toContain(option.flag)
      expect(out).toContain('--json')
    }
  })
  it('prints help and version with exit code 0', async () => {
    const help = await said(['--help'])
    expect(help.exitCode).toBe(0)
    for (const { name } of commands) expect(help.out).toContain(name)
    expect(await said(['--version'])).toMatchObject({ exitCode: 0, out: '1.2.3' })
  })
  it('hands arguments, counts, texts and switches to the command', async () => {
    let got: unknown
    const rows = probe(async ({ arguments: given, counts, texts, switches }) => {
      got = { given, counts, texts, switches }
      return 75
    })
    const { exitCode } = await said(
      ['probe', 'a.yaml', '--stop-after', '400', '--record', 'd', '--accept-changes'],
      rows,
    )
    expect(exitCode).toBe(75)
    expect(got).toEqual({
      given: { FILE: 'a.yaml' },
      counts: { '--stop-after': 400 },
      texts: { '--record': 'd' },
      switches: { '--accept-changes': true },
    })
  })
})

describe('a mistake on the command line', () => {
  const cases: readonly [string, readonly string[], RegExp][] = [
    ['no command', [], /no command was given/],
    ['an unknown command, with the nearest name', ['porgress', 'x'], /porgress.*Did you mean progress/],
    ['an unknown option, with the nearest name', ['run', 'x', '--cors', '2'], /--cors.*Did you mean --cores/],
    ['a missing argument', ['run'], /FILE/],
    ['an argument too many', ['run', 'x', 'y'], /too many arguments/i],
    ['a count that is none', ['run', 'x', '--cores', 'two'], /whole number from 1/],
  ]
  for (const [what, argv, expected] of cases) {
    it(`ends with exit code 64 and a sentence: ${what}`, async () => {
      const { exitCode, notes, out } = await said(argv)
      expect(exitCode).toBe(64)
      expect(notes).toMatch(expected)
      expect(notes).not.toMatch(/^\s+at /m)
      expect(out).toBe('')
    })
  }
})

describe('what a command throws', () => {
  const thrower = (error: unknown) => probe(() => Promise.reject(error))
  it('ends with the exit code of the refusal', async () => {
    const full = thrower(refuse('disk-full', { detail: 'records/x has no room.' }))
    expect(await said(['probe', 'x'], full)).toMatchObject({ exitCode: 74 })
    const bad = thrower(refuse('record-corrupted', { detail: 'entry 7 is damaged.' }))
    expect(await said(['probe', 'x'], bad)).toMatchObject({ exitCode: 65 })
  })
  it('is one JSON object with --json, and nothing else anywhere', async () => {
    const { out, notes } = await said(
      ['probe', 'x', '--json'],
      thrower(refuse('disk-full', { detail: 'no room.' })),
    )
    expect(JSON.parse(out)).toMatchObject({ refused: { code: 'disk-full', exitCode: 74 } })
    expect(notes).toBe('')
  })
  it('shows no stack unless --trace asks for it', async () => {
    const ours = probe(() => {
      check(false, 'an island is never empty')
      return Promise.resolve(0)
    })
    const plain = await said(['probe', 'x'], ours)
    expect(plain.exitCode).toBe(70)
    expect(plain.notes).toContain('an island is never empty')
    expect(plain.notes).not.toMatch(/^\s+at /m)
    expect((await said(['probe', 'x', '--trace'], ours)).notes).toMatch(/^\s+at /m)
  })
})
