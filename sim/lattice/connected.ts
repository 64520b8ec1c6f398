// Whether a body hangs together. Nodes that are held (pinned, or moved along a path) count as joined to each other:
// what hangs on them does not fall apart.

import { refuse } from '../../shared/refusals.js'
import type { LatticeSpec } from './spec.js'

/** Throws a Refusal ('impossible-value') that names the first node without a way to the others. */
export function checkConnected(spec: LatticeSpec): void {
  if (spec.separateBodies) return
  const parent = Int32Array.from(spec.nodes, (_, i) => i)
  const rootOf = (node: number): number => {
    let root = node
    while (parent[root] !== root) {
      parent[root] = parent[parent[root]!]!
      root = parent[root]!
    }
    return root
  }
  const join = (a: number, b: number) => {
    parent[rootOf(a)] = rootOf(b)
  }
  const { struts, actuators = [], guided = [], dragStruts = [], areas = [], volumes = [] } = spec
  for (const { a, b } of [...struts, ...actuators, ...guided, ...dragStruts]) join(a, b)
  for (const { nodes } of [...areas, ...volumes]) for (const node of nodes) join(node, nodes[0])
  const paths = (spec.prescribed ?? []).map((path) => path.node)
  const held = spec.nodes.flatMap((node, i) => (node.pinned || paths.includes(i) ? [i] : []))
  for (const node of held) join(node, held[0]!)
  const first = rootOf(0)
  const lone = spec.nodes.findIndex((_, i) => rootOf(i) !== first)
  if (lone < 0) return
  throw refuse('impossible-value', {
    detail: `found no way along struts from node ${lone} to node 0, expected one body.`,
    where: { field: `lattice.nodes[${lone}]` },
    cure: 'Join the parts, or say `separateBodies: true` where several bodies are meant.',
  })
}
