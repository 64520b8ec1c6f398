// The commands: one row each. Reading of arguments, help and errors follow from the rows; adding a command is a file and a row.

import { CommanderError, InvalidArgumentError, Command as Parser } from 'commander'
import { BrokenPromise } from '../../shared/check.js'
import { exitCodes, Refusal, refuse, renderRefusal } from '../../shared/refusals.js'
import { checkCommand } from './check.js'
import type { Command, CommandInput, OptionRow, Output } from './command.js'
import { demoCommand } from './demo.js'
import { newCommand } from './new.js'
import { preflightCommand } from './preflight.js'
import { progressCommand } from './progress.js'
import { rederiveCommand } from './rederive.js'
import { runCommand } from './run.js'
import { workCommand } from './work.js'

export const commands: readonly Command[] = [
  newCommand,
  checkCommand,
  runCommand,
  workCommand,
  progressCommand,
  rederiveCommand,
  preflightCommand,
  demoCommand,
]

/** Options that every command takes. */
export const globalOptions: readonly OptionRow[] = [
  { flag: '--json', kind: 'switch', help: 'print one JSON object on standard output, nothing else' },
  { flag: '--trace', kind: 'switch', help: 'print where in the code an error came from' },
]

/** Runs one command line and answers the exit code; nothing is thrown. `version` is the package's. */
export async function runCommandLine(
  argv: readonly string[],
  version: string,
  makeOutput: (json: boolean) => Output,
  rows: readonly Command[] = commands,
): Promise<number> {
  const json = argv.includes('--json')
  const output = makeOutput(json)
  let exitCode: number = exitCodes.done
  const parser = makeParser(version, output, rows, async (run) => {
    exitCode = await run
  })
  try {
    await parser.parseAsync([...argv], { from: 'user' })
    return exitCode
  } catch (error) {
    return report(error, output, argv.includes('--trace'))
  }
}

function makeParser(
  version: string,
  output: Output,
  rows: readonly Command[],
  finish: (run: Promise<number>) => Promise<void>,
): Parser {
  const parser = new Parser('skerry')
  parser
    .description('Long evolutionary searches of physical machines that nothing can break.')
    .version(version, '--version', 'print the version')
    .helpOption('--help', 'print this help')
    .helpCommand(false)
    .exitOverride()
    .configureOutput({ writeOut: (text) => output.print(text.trimEnd()), writeErr: () => {} })
    .addHelpText('after', '\nskerry COMMAND --help shows what a command takes, with an example.')
  for (const row of rows) addRow(parser, row, output, finish)
  return parser
}

function addRow(
  parser: Parser,
  row: Command,
  output: Output,
  finish: (run: Promise<number>) => Promise<void>,
): void {
  const command = parser.command(row.name).description(row.summary).helpOption('--help', 'print this help')
  for (const argument of row.arguments) command.argument(`<${argument.name}>`, argument.help)
  for (const option of [...row.options, ...globalOptions]) addOption(command, option)
  command.addHelpText('after', `\nExamples:\n${row.examples.map((example) => `  ${example}`).join('\n')}`)
  command.exitOverride().configureOutput(parser.configureOutput())
  command.action((...given: unknown[]) => {
    const texts = given.slice(0, row.arguments.length) as string[]
    const options = command.opts<{ readonly [name: string]: unknown }>()
    return finish(row.run(inputOf(row, texts, options, output)))
  })
}

function addOption(command: Parser, option: OptionRow): void {
  if (option.kind === 'switch') command.option(option.flag, option.help)
  else if (option.kind === 'text') command.option(`${option.flag} <${option.value}>`, option.help)
  else command.option(`${option.flag} <${option.value}>`, option.help, countOf)
}

function countOf(text: string): number {
  if (!/^[1-9]\d{0,14}$/.test(text)) throw new InvalidArgumentError('Expected a whole number from 1.')
  return Number(text)
}

function inputOf(
  row: Command,
  texts: readonly string[],
  options: { readonly [name: string]: unknown },
  output: Output,
): CommandInput {
  const of = (kind: OptionRow['kind']) =>
    Object.fromEntries(
      row.options.filter((option) => option.kind === kind).map(({ flag }) => [flag, options[camel(flag)]]),
    )
  return {
    arguments: Object.fromEntries(row.arguments.map(({ name }, index) => [name, texts[index]!])),
    switches: of('switch') as CommandInput['switches'],
    texts: of('text') as CommandInput['texts'],
    counts: of('count') as CommandInput['counts'],
    output,
  }
}

/** --stop-after as stopAfter, the name commander keeps it under. */
function camel(flag: string): string {
  return flag.slice(2).replace(/-([a-z])/g, (_, letter: string) => letter.toUpperCase())
}

/** Says what went wrong, for a person or as JSON, and answers the exit code. */
function report(error: unknown, output: Output, trace: boolean): number {
  if (error instanceof CommanderError && error.exitCode === 0) return exitCodes.done
  const refusal = refusalFrom(error)
  if (output.json) {
    const { code, exitCode, detail, where, cure } = refusal
    output.print(
      JSON.stringify(
        { refused: { code, exitCode, message: refusal.message, detail, where, cure } },
        undefined,
        2,
      ),
    )
  } else {
    output.note(renderRefusal(refusal))
  }
  if (trace && error instanceof Error) {
    output.note(error.stack ?? String(error))
    if (error.cause instanceof Error) output.note(`caused by ${error.cause.stack}`)
  }
  return refusal.exitCode
}

function refusalFrom(error: unknown): Refusal {
  if (error instanceof Refusal) return error
  if (error instanceof CommanderError) {
    const text = error.message.replace(/^error: /, '').replace(/\s*\n\s*/g, ' ') || 'no command was given'
    return refuse('usage', { detail: error.code === 'commander.help' ? 'no command was given' : text })
  }
  const detail =
    error instanceof BrokenPromise
      ? error.message
      : `unexpected: ${error instanceof Error ? error.message : String(error)}`
  return refuse('internal', { detail, cause: error })
}
