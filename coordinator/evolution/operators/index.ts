// Variation operators, as others see them: the tables, the defaults, and the making of a Variation.

export { distanceOf } from './distance.js'
export type { Crossover, CrossoverRow, Mutation, MutationRow } from './rows.js'
export {
  checkOperator,
  crossoverRows,
  defaultOperator,
  defaultOperators,
  mutationRows,
  operatorDefaults,
  rowOf,
} from './tables.js'
export { makeVariation, type VariationOptions } from './variation.js'
