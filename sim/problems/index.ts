// The problems that come with Skerry, by name. A search file names one by the module a plug-in would import,
// 'skerry/problems/NAME'; every module has the problem as its default export.

import { type ClassicName, classics } from './classic/index.js'

export interface BuiltInProblem {
  /** What a plug-in imports: `export { default } from MODULE`. */
  readonly module: string
  /** Folder under sim/problems. */
  readonly folder: string
  readonly summary: string
}

function row(name: string, summary: string): [string, BuiltInProblem] {
  return [name, { module: `skerry/problems/${name}`, folder: name, summary }]
}

export const builtInProblems: { readonly [name: string]: BuiltInProblem } = Object.fromEntries([
  row(
    'culvert-crawler',
    'A soft truss crawls along a culvert with debris on its floor, carrying a sensor puck.',
  ),
  row(
    'pump-mount',
    'A lattice of rubber and spring steel carries a sensor on a pump and keeps the pump’s shaking from it.',
  ),
  row(
    'culvert-crawler-3d',
    'A soft truss of three chains crawls along the round bottom of a pipe, carrying a sensor puck.',
  ),
  row(
    'ramp-walker',
    'A passive walker on two straight legs is let go on the ramp of a drained channel and walks down it.',
  ),
  row(
    'seal-pad',
    'A rubber pad of repeated cells for a hatch seal, toward a wanted Poisson ratio and stiffness.',
  ),
  row(
    'screen-rake',
    'A motor-driven linkage rakes debris up an intake screen and over its lip into a trough.',
  ),
  ...(Object.keys(classics) as ClassicName[]).map((name) => row(name, classics[name].summary)),
])
