// Reading back what save() gave: a snapshot comes from a database, so its shape is checked. Individuals are kept
// by id only; the island finds them.

import { z } from 'zod'

export const savedIds = z.array(z.int().nonnegative())
export const savedCount = z.int().nonnegative()

export function idsOf(individuals: readonly { readonly id: number }[]): number[] {
  return individuals.map((individual) => individual.id)
}
