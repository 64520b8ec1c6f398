// The public entry for authors of plug-ins: `import { defineProblem, real } from 'skerry'`. Pure, and bundled into
// the plug-in together with whatever it uses of it.

export { detMath } from '../shared/detmath/index.js'
export { bits, choice, integer, layout, real } from '../shared/encodings.js'
export type * from '../shared/genome.js'
export type * from '../shared/problem.js'
export type { Stream } from '../shared/streams.js'
export { advance, type Fault, groundHeightM, timeSeconds } from './lattice/advance.js'
export { buildLattice, type Lattice } from './lattice/build.js'
export * as observe from './lattice/observe.js'
export type * from './lattice/spec.js'
export { stepBound } from './lattice/stability.js'
export * from './measure/index.js'
export { defineProblem } from './problem.js'
