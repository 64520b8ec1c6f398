// Evolution's tables in the form the reader of search files takes them.

import { methods } from '../evolution/methods/index.js'
import { crossoverRows, mutationRows, operatorDefaults } from '../evolution/operators/index.js'
import type { SearchTables } from './searchfile/tables.js'

export function searchTables(semantics = 1): SearchTables {
  return {
    semantics,
    methods,
    crossovers: crossoverRows,
    mutations: mutationRows,
    defaultOperators: (encoding) => operatorDefaults[encoding.kind],
  }
}
