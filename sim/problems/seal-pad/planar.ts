// Whether walls run through each other: the model has no contact, so a squeezed cell whose walls meet is not simulated
// rightly any more.

import { type Framework, type FrameworkSpec, placeBar } from '../../frames/index.js'

interface Segment {
  readonly a: number
  readonly b: number
  readonly shift: readonly [number, number]
  readonly x0: number
  readonly y0: number
  readonly x1: number
  readonly y1: number
}

/** Whether any two walls (chords between nodes) cross in the state u, copies of the cell included. */
export function wallsMeet(framework: Framework, u: Float64Array, spec: FrameworkSpec): boolean {
  const m = framework.meanStrain
  const [[px], [, py]] = spec.periods!
  // Where the copy of the cell one period to the right or up has gone.
  const right = [px * (1 + u[m]!), px * u[m + 2]!] as const
  const up = [py * u[m + 2]!, py * (1 + u[m + 1]!)] as const
  const segments = framework.bars.map((bar, i): Segment => {
    const moved = placeBar(bar, m, u)
    const { a, b, shift = [0, 0] } = spec.bars[i]!
    const [x0, y0] = [spec.nodes[a]![0] + moved[0]!, spec.nodes[a]![1] + moved[1]!]
    const x1 = spec.nodes[a]![0] + bar.alongM[0] + moved[3]!
    const y1 = spec.nodes[a]![1] + bar.alongM[1] + moved[4]!
    return { a, b, shift, x0, y0, x1, y1 }
  })
  for (let i = 0; i < segments.length; i++) {
    for (let j = i; j < segments.length; j++) {
      for (let p = -1; p <= 1; p++) {
        for (let q = -1; q <= 1; q++) {
          if (i === j && (p < 0 || (p === 0 && q <= 0))) continue
          if (sharesNode(segments[i]!, segments[j]!, p, q)) continue
          if (cross(segments[i]!, segments[j]!, p * right[0] + q * up[0], p * right[1] + q * up[1]))
            return true
        }
      }
    }
  }
  return false
}

/** Ends of segment t in the copy (p, q) against ends of s. */
function sharesNode(s: Segment, t: Segment, p: number, q: number): boolean {
  const same = (n: number, nx: number, ny: number, m: number, mx: number, my: number) =>
    n === m && nx === mx && ny === my
  return (
    same(s.a, 0, 0, t.a, p, q) ||
    same(s.a, 0, 0, t.b, p + t.shift[0], q + t.shift[1]) ||
    same(s.b, s.shift[0], s.shift[1], t.a, p, q) ||
    same(s.b, s.shift[0], s.shift[1], t.b, p + t.shift[0], q + t.shift[1])
  )
}

/** Whether segment s and segment t moved by (dx, dy) have a point in common inside both. */
function cross(s: Segment, t: Segment, dx: number, dy: number): boolean {
  const [tx0, ty0, tx1, ty1] = [t.x0 + dx, t.y0 + dy, t.x1 + dx, t.y1 + dy]
  if (Math.max(s.x0, s.x1) < Math.min(tx0, tx1) || Math.max(tx0, tx1) < Math.min(s.x0, s.x1)) return false
  if (Math.max(s.y0, s.y1) < Math.min(ty0, ty1) || Math.max(ty0, ty1) < Math.min(s.y0, s.y1)) return false
  const side = (ax: number, ay: number, bx: number, by: number, x: number, y: number) =>
    (bx - ax) * (y - ay) - (by - ay) * (x - ax)
  const first = side(s.x0, s.y0, s.x1, s.y1, tx0, ty0) * side(s.x0, s.y0, s.x1, s.y1, tx1, ty1)
  const second = side(tx0, ty0, tx1, ty1, s.x0, s.y0) * side(tx0, ty0, tx1, ty1, s.x1, s.y1)
  return first <= 0 && second <= 0
}
