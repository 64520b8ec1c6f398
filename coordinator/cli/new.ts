// `skerry new DIR`: a search file and a problem that run at once, to be changed into one's own.

import { existsSync, mkdirSync, writeFileSync } from 'node:fs'
import { availableParallelism } from 'node:os'
import { basename, join, resolve } from 'node:path'
import { exitCodes, refuse } from '../../shared/refusals.js'
import type { Command, CommandInput } from './command.js'
import { problemText, searchText } from './new-files.js'

export const newCommand: Command = {
  name: 'new',
  summary: 'Write a commented search file and a small problem that run at once.',
  arguments: [{ name: 'DIR', help: 'folder for the two files; made if it is not there' }],
  options: [
    {
      flag: '--workers',
      value: 'N',
      kind: 'count',
      help: 'simulations at once to plan for (default: the cores of this machine)',
    },
  ],
  examples: ['skerry new gauge-mount', 'skerry new gauge-mount --workers 40'],
  run,
}

async function run({ arguments: given, counts, output }: CommandInput): Promise<number> {
  const folder = given.DIR!
  const files = [
    {
      path: join(folder, 'search.yaml'),
      text: searchText(nameFrom(folder), counts['--workers'] ?? availableParallelism()),
    },
    { path: join(folder, 'problem.ts'), text: problemText },
  ]
  const taken = files.find(({ path }) => existsSync(path))
  if (taken) {
    throw refuse('usage', {
      detail: `${taken.path} is there already; new never overwrites.`,
      where: { file: taken.path },
      cure: 'Name another folder.',
    })
  }
  write(folder, files)
  const paths = files.map(({ path }) => path)
  if (output.json) output.print(JSON.stringify({ files: paths }))
  else {
    output.print(
      `Wrote ${paths.join(' and ')}: a mount for a pressure gauge, to be changed into your machine.`,
    )
    output.print(`Next:  skerry check ${paths[0]}\n       skerry run ${paths[0]}`)
  }
  return exitCodes.done
}

/** The name of the folder, as far as a name may look like it. */
export function nameFrom(folder: string): string {
  const name = basename(resolve(folder))
    .toLowerCase()
    .replace(/[^a-z0-9]+/g, '-')
    .replace(/^-+|-+$/g, '')
    .slice(0, 60)
  return name || 'search'
}

function write(folder: string, files: readonly { readonly path: string; readonly text: string }[]): void {
  try {
    mkdirSync(folder, { recursive: true })
    for (const { path, text } of files) writeFileSync(path, text, { flag: 'wx' })
  } catch (error) {
    const code = error instanceof Error && 'code' in error ? String(error.code) : ''
    const kind =
      code === 'ENOSPC'
        ? 'disk-full'
        : // Node answers ENOENT where a folder cannot be made on a read-only file system.
          code === 'EROFS' || code === 'EACCES' || code === 'EPERM' || code === 'ENOENT'
          ? 'disk-read-only'
          : 'disk-error'
    const text = error instanceof Error ? error.message : String(error)
    throw refuse(kind, { detail: `${text}.`, where: { file: folder }, cause: error })
  }
}
