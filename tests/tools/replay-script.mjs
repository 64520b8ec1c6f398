// Bundles the script of the replay pages: coordinator/evidence/pictures/replay-client.js with the core of
// shared/pictures, into replay-script.ts beside it. Run it after a change to either; a test compares
// (coordinator/evidence/pictures/replay-script.test.ts). The result is committed, so that pages can be written from
// source and from dist/ alike and need no bundler where Skerry runs.

import { readFileSync, writeFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { buildSync } from 'esbuild'

const root = join(dirname(fileURLToPath(import.meta.url)), '..', '..')
const folder = 'coordinator/evidence/pictures'
export const entry = `${folder}/replay-client.js`
export const target = `${folder}/replay-script.ts`

/** The script as text, and the files it was made from. */
export function bundle() {
  const built = buildSync({
    absWorkingDir: root,
    entryPoints: [entry],
    bundle: true,
    format: 'iife',
    target: 'es2022',
    minify: true,
    charset: 'utf8',
    legalComments: 'none',
    metafile: true,
    write: false,
  })
  // Inside a script element nothing may look like its end.
  const code = built.outputFiles[0].text.trim().replace(/<\/(?=script)/gi, '<\\/')
  const notice = readFileSync(join(root, 'shared/detmath/NOTICE.txt'), 'utf8').trim()
  const script = `/*\n${notice}\n*/\n${code}`
  return { script, sources: Object.keys(built.metafile.inputs).sort() }
}

/** The module that holds the script. */
export function moduleText(script) {
  const quoted = `'${script.replaceAll('\\', '\\\\').replaceAll("'", "\\'").replaceAll('\n', '\\n')}'`
  return `// biome-ignore-all format: made by tests/tools/replay-script.mjs, not by hand
// biome-ignore-all lint: made by tests/tools/replay-script.mjs, not by hand
// The script of the replay pages, bundled from the file named here and what it imports of shared/pictures.

export const bundledFrom = './replay-client.js'

export const replayScript = ${quoted}
`
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const path = join(root, target)
  const text = moduleText(bundle().script)
  const isNew = readFileSync(path, { encoding: 'utf8', flag: 'a+' }) !== text
  if (isNew) writeFileSync(path, text)
  console.log(`replay script: ${(text.length / 1000).toFixed(0)} kB, ${isNew ? 'written' : 'as it was'}`)
}
