// Is this a genome specification? Asked once of what a plug-in gives; afterwards the type is trusted.

import { encodingKinds, encodings, rowOf, type SpecFault } from './encodings/rows.js'
import { encodingSchemas } from './encodings/schemas.js'
import { foundText, slotsOf } from './encodings.js'
import type { Encoding, GenomeSpec } from './genome.js'
import { limits } from './limits.js'
import { refuse } from './refusals.js'

/** Names of parts start with a letter: the order of such keys is the order of declaration. */
const partName = /^[A-Za-z][A-Za-z0-9-]*$/

/**
 * Refuses ('not-a-problem', with the field) what is no genome specification. Takes what a plug-in gives: after
 * this the type can be trusted.
 */
export function checkSpec(spec: unknown): asserts spec is GenomeSpec {
  if (typeof spec !== 'object' || spec === null || Array.isArray(spec)) {
    throw specRefusal('genome', `expected an object of named parts, found ${foundText(spec)}`)
  }
  const parts = Object.entries(spec as { readonly [part: string]: unknown })
  if (parts.length < 1 || parts.length > limits.partsMost) {
    throw specRefusal('genome', `expected 1 to ${limits.partsMost} parts, found ${parts.length}`)
  }
  let slots = 0
  for (const [part, encoding] of parts) {
    if (!partName.test(part) || part.length > limits.nameLength) {
      throw specRefusal(
        `genome.${part}`,
        `expected a name of letters, digits and hyphens that starts with a letter, at most ${limits.nameLength} long`,
      )
    }
    const fault = encodingFault(encoding)
    if (fault) throw specRefusal(`genome.${part}${fault.field && `.${fault.field}`}`, fault.detail)
    slots += slotsOf(encoding as Encoding)
  }
  if (slots > limits.genomeSlots) {
    throw specRefusal(
      'genome',
      `expected at most ${limits.genomeSlots} slots in all parts together, found ${slots}`,
    )
  }
}

function specRefusal(field: string, detail: string): Error {
  return refuse('not-a-problem', {
    detail,
    where: { field },
    cure: 'Mend this field of the genome in the problem; real(), integer(), choice(), bits() and layout() make parts.',
  })
}

function encodingFault(encoding: unknown): SpecFault | undefined {
  if (typeof encoding !== 'object' || encoding === null) {
    return {
      field: '',
      detail: `expected an encoding such as real({ low: 0, high: 1 }), found ${foundText(encoding)}`,
    }
  }
  const kind = (encoding as { readonly kind?: unknown }).kind
  if (typeof kind !== 'string' || !Object.hasOwn(encodings, kind)) {
    return { field: 'kind', detail: `expected one of ${encodingKinds.join(', ')}, found ${foundText(kind)}` }
  }
  const read = encodingSchemas[kind as Encoding['kind']].safeParse(encoding)
  const issue = read.error?.issues[0]
  if (issue) return { field: issue.path.join('.'), detail: issue.message }
  return rowOf(encoding as Encoding).relations(encoding as Encoding)
}
