// Struts and what sits on them. A passive strut is a line whose weight is its stiffness class. An actuator is a sleeve
// on a rod: two rails, and bars across whose number stays, so that they open and close like bellows; driven longer they
// point outwards, driven shorter inwards, and the harder the drive the bolder they are.

import type { KindLook } from './looks.js'
import type { Operation } from './operations.js'
import { railWidthPx, sleeveWidthPx } from './style.js'

/** Of a view, or of a legend's sample. */
export interface Weights {
  readonly unit: number
  readonly lineFactor: number
  /** Mean length of links on the picture: sleeves are no thicker than short links allow. */
  readonly meanLinkPx: number
}

export interface LinkBatch {
  readonly look: KindLook
  /** x0, y0, x1, y1 of each link. */
  readonly lines: readonly (readonly number[])[]
  /** Drive of each link, -1 to 1; empty where passive. */
  readonly drives: readonly number[]
}

export function linkOperations(batch: LinkBatch, weights: Weights): Operation[] {
  if (batch.lines.length === 0) return []
  return batch.look.isActive ? actuatorOperations(batch, weights) : [strutOperation(batch, weights)]
}

/** Never finer than this, so that the softest strut survives small pictures. */
const finestPx = 0.9

export function strutWidthPx(look: KindLook, { unit, lineFactor }: Weights): number {
  return Math.max(finestPx * unit, look.widthPx * unit * lineFactor)
}

function strutOperation({ look, lines }: LinkBatch, weights: Weights): Operation {
  const widthPx = strutWidthPx(look, weights)
  return { shape: 'lines', role: 'strut', lines, stroke: look.ink, widthPx, ...dashed(look.dash, widthPx) }
}

function dashed(dash: readonly number[], widthPx: number) {
  return dash.length === 0 ? {} : { dashPx: dash.map((part) => part * widthPx) }
}

export function sleevePx({ unit, lineFactor, meanLinkPx }: Weights): number {
  return Math.min(sleeveWidthPx * unit * lineFactor, 0.34 * meanLinkPx)
}

/** Dashes of notched edges, in units of a rail's width. */
const notches = [4.2, 2.4]

/** Where the sleeve begins and ends along its link. */
const [sleeveFrom, sleeveTo] = [0.14, 0.86]

function actuatorOperations(batch: LinkBatch, weights: Weights): Operation[] {
  const { look, lines, drives } = batch
  const railPx = Math.max(finestPx * weights.unit, railWidthPx * weights.unit * weights.lineFactor)
  const insidePx = Math.max(railPx, sleevePx(weights) - railPx)
  const sleeves = lines.map((line) => part(line, sleeveFrom, sleeveTo))
  const force = drives.reduce((sum, drive) => sum + Math.abs(drive), 0) / Math.max(1, drives.length)
  const stroke = look.ink
  return [
    { shape: 'lines', role: 'actuator', lines, stroke, widthPx: 1.3 * railPx },
    {
      shape: 'lines',
      role: 'hatch',
      lines: sleeves,
      stroke,
      widthPx: insidePx + 2 * railPx,
      ...(look.isNotched ? { dashPx: notches.map((one) => one * railPx) } : {}),
    },
    {
      shape: 'lines',
      role: 'hatch',
      lines: sleeves,
      stroke: look.isFull ? stroke : 'paper',
      widthPx: insidePx,
    },
    {
      shape: 'lines',
      role: 'hatch',
      lines: sleeves.flatMap((sleeve, i) => bars(sleeve, drives[i] ?? 0, insidePx / 2, weights)),
      stroke: look.isFull ? 'paper' : stroke,
      widthPx: railPx * (0.7 + 0.9 * force),
    },
  ]
}

function part([x0, y0, x1, y1]: readonly number[], from: number, to: number): number[] {
  const [dx, dy] = [x1! - x0!, y1! - y0!]
  return [x0! + from * dx, y0! + from * dy, x0! + to * dx, y0! + to * dy]
}

/** Bars across a sleeve; their middles are pushed along it by the drive. */
function bars(
  [x0, y0, x1, y1]: readonly number[],
  drive: number,
  halfPx: number,
  weights: Weights,
): number[][] {
  const [dx, dy] = [x1! - x0!, y1! - y0!]
  const lengthPx = Math.sqrt(dx * dx + dy * dy)
  if (lengthPx < 1) return []
  const [alongX, alongY] = [dx / lengthPx, dy / lengthPx]
  const count = barCount(weights)
  const across = [-alongY * halfPx, alongX * halfPx] as const
  return Array.from({ length: count }, (_, i) => {
    const share = (i + 0.5) / count
    const push = Math.sign(share - 0.5) * drive * 1.15 * halfPx
    const [x, y] = [x0! + share * dx, y0! + share * dy]
    return [x + across[0], y + across[1], x + push * alongX, y + push * alongY, x - across[0], y - across[1]]
  })
}

/** Even, so that no bar stands in the middle, where it could point nowhere. */
export function barCount({ unit, lineFactor, meanLinkPx }: Weights): number {
  const fits = ((sleeveTo - sleeveFrom) * meanLinkPx) / (7.5 * unit * Math.max(0.7, lineFactor))
  return 2 * Math.min(4, Math.max(1, Math.round(fits / 2)))
}

/**
 * A support as in drawings of statics: a filled triangle, its tip in the node. Shape says contact, not colour.
 * `discs`: x, y, radius of the nodes that touch.
 */
export function contactOperation(discs: readonly number[], { unit, lineFactor }: Weights): Operation[] {
  const lines: number[][] = []
  for (let i = 0; i < discs.length; i += 3) {
    const [x, y] = [discs[i]!, discs[i + 1]!]
    const high = discs[i + 2]! + 6 * unit * Math.max(0.75, lineFactor)
    lines.push([x, y, x + 0.62 * high, y + high, x - 0.62 * high, y + high])
  }
  if (lines.length === 0) return []
  const look = { isClosed: true, fill: 'contact', stroke: 'paper', widthPx: unit } as const
  return [{ shape: 'lines', role: 'contact', lines, ...look }]
}

export function nodeOperation(discs: readonly number[], { unit, lineFactor }: Weights): Operation[] {
  if (discs.length === 0) return []
  const widthPx = Math.max(finestPx * unit, 1.4 * unit * lineFactor)
  return [{ shape: 'discs', role: 'node', discs, fill: 'paper', stroke: 'ink', widthPx }]
}
