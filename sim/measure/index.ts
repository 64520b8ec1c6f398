// What authors of problems measure with. Every tool names its units, the source of its formula, and is held to
// published values in tests/reference/measure-*.test.ts.

export type * from './cell.js'
export * from './elasticity.js'
export { type Homogenised, homogenise } from './homogenise.js'
