// The public entry for authors of plug-ins: `import { defineProblem, real } from 'skerry'`. Pure, and bundled into
// the plug-in together with whatever it uses of it.

export { bits, choice, integer, layout, real } from '../shared/encodings.js'
export type * from '../shared/genome.js'
export type * from '../shared/problem.js'
export type { Stream } from '../shared/streams.js'
export { defineProblem } from './problem.js'
