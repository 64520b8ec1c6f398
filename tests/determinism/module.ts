// The golden simulations as one ES module, bundled as the program bundles plug-ins: with its opening text (exact
// mathematics, no clocks, no entropy) and without any module of Node.

import { fileURLToPath } from 'node:url'
import { bundlePlugin } from '../../worker/plugin/bundle.js'
import { ensureBuilt } from '../tools/built.js'

/** The module's text; its default export is computeGolden() of golden.ts. */
export async function goldenModule(): Promise<string> {
  ensureBuilt()
  const { code } = await bundlePlugin(fileURLToPath(new URL('golden.ts', import.meta.url)))
  return code
}
