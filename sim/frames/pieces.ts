// Bars in shorter pieces: for large displacements, vibrations and buckling, where one bar a wall is too coarse.

import type { FrameworkSpec, Point } from './spec.js'

/**
 * Every bar in `pieces` equal ones, welded in line, pieces of one bar side by side in the list. Pin-jointed bars stay.
 * `bowM` says how far the middle of a bar is out of line to its left (a parabola), as a wall that is not cast straight.
 */
export function inPieces(
  spec: FrameworkSpec,
  pieces: number,
  bowM: (bar: number) => number = () => 0,
): FrameworkSpec {
  if (pieces === 1) return spec
  const nodes: Point[] = [...spec.nodes]
  const [p, q] = spec.periods ?? [
    [0, 0],
    [0, 0],
  ]
  const bars = spec.bars.flatMap((bar, index) => {
    if (!bar.bendingNm2) return [bar]
    const { shift, turnA = 0, turnB = 0, ...rest } = bar
    const [ax, ay] = spec.nodes[bar.a]!
    const [bx, by] = spec.nodes[bar.b]!
    const [i, j] = shift ?? [0, 0]
    const dx = bx + i * p[0] + j * q[0] - ax
    const dy = by + i * p[1] + j * q[1] - ay
    const first = nodes.length
    const lengthM = Math.sqrt(dx * dx + dy * dy)
    for (let k = 1; k < pieces; k++) {
      const along = k / pieces
      const out = (4 * along * (1 - along) * bowM(index)) / lengthM
      nodes.push([ax + dx * along - dy * out, ay + dy * along + dx * out])
    }
    return Array.from({ length: pieces }, (_, k) => ({
      ...rest,
      a: k === 0 ? bar.a : first + k - 1,
      b: k === pieces - 1 ? bar.b : first + k,
      ...(k === 0 ? { turnA } : {}),
      ...(k === pieces - 1 ? { turnB, ...(shift ? { shift } : {}) } : {}),
    }))
  })
  return { ...spec, nodes, bars }
}
