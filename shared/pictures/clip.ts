// Lines cut at the edges of a rectangle, in pixels: walls, ground and grids are far longer than what is shown of them.

import type { Rectangle } from './view.js'

/** The pieces of a line x0, y0, x1, ... that lie in the rectangle. */
export function clippedLine(points: readonly number[], rectangle: Rectangle): number[][] {
  const pieces: number[][] = []
  let piece: number[] = []
  for (let i = 0; i + 3 < points.length; i += 2) {
    const cut = clippedPiece(points[i]!, points[i + 1]!, points[i + 2]!, points[i + 3]!, rectangle)
    if (cut === undefined) continue
    const [x0, y0, x1, y1] = cut
    const joins = piece.length > 0 && piece[piece.length - 2] === x0 && piece[piece.length - 1] === y0
    if (!joins) {
      piece = [x0, y0]
      pieces.push(piece)
    }
    piece.push(x1, y1)
  }
  return pieces
}

const straightPx = 0.05

/**
 * A line from left to right without the points that lie on it anyway, to a twentieth of a pixel: level ground needs but
 * its ends. From the last point kept, `least` and `most` are the slopes that pass every point since.
 */
export function withoutStraightPoints(points: readonly number[]): number[] {
  const kept = points.slice(0, 2)
  let [least, most] = [-Infinity, Infinity]
  for (let i = 2; i + 1 < points.length; i += 2) {
    const [x, y] = [points[i]!, points[i + 1]!]
    const slope = slopeFrom(kept, x, y)
    if (i > 2 && !(slope >= least && slope <= most)) {
      kept.push(points[i - 2]!, points[i - 1]!)
      ;[least, most] = [-Infinity, Infinity]
    }
    least = Math.max(least, slopeFrom(kept, x, y - straightPx))
    most = Math.min(most, slopeFrom(kept, x, y + straightPx))
  }
  return [...kept, ...points.slice(-2)]
}

/** From the last point of a line; a step is infinitely steep. */
function slopeFrom(line: readonly number[], x: number, y: number): number {
  const [dx, dy] = [x - line[line.length - 2]!, y - line[line.length - 1]!]
  return dx > 0 ? dy / dx : Math.sign(dy) * Infinity
}

/** The part of a straight piece inside, by the method of Liang and Barsky (1984, from memory); undefined where none is. */
export function clippedPiece(
  x0: number,
  y0: number,
  x1: number,
  y1: number,
  { leftPx, topPx, widthPx, heightPx }: Rectangle,
): readonly [number, number, number, number] | undefined {
  let [enter, leave] = [0, 1]
  const edges = [
    [x0 - x1, x0 - leftPx],
    [x1 - x0, leftPx + widthPx - x0],
    [y0 - y1, y0 - topPx],
    [y1 - y0, topPx + heightPx - y0],
  ] as const
  for (const [out, room] of edges) {
    if (out === 0 && room < 0) return undefined
    if (out < 0) enter = Math.max(enter, room / out)
    if (out > 0) leave = Math.min(leave, room / out)
  }
  if (enter > leave) return undefined
  const at = (share: number) => [x0 + share * (x1 - x0), y0 + share * (y1 - y0)] as const
  const [from, to] = [
    enter > 0 ? at(enter) : ([x0, y0] as const),
    leave < 1 ? at(leave) : ([x1, y1] as const),
  ]
  return [from[0], from[1], to[0], to[1]]
}
