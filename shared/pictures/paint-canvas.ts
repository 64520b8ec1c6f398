// Paints a display list on a canvas, or on anything with the same few methods.

import type { Discs, Lines, Look, Operation, Words } from './operations.js'
import { fontFamily, type Theme } from './style.js'

/** What is used of a CanvasRenderingContext2D. */
export interface Pen {
  lineWidth: number
  lineCap: 'butt' | 'round' | 'square'
  lineJoin: 'miter' | 'round' | 'bevel'
  globalAlpha: number
  font: string
  textAlign: 'start' | 'center' | 'end' | 'left' | 'right'
  fillStyle: unknown
  strokeStyle: unknown
  beginPath(): void
  closePath(): void
  moveTo(x: number, y: number): void
  lineTo(x: number, y: number): void
  arc(x: number, y: number, radius: number, from: number, to: number): void
  fill(): void
  stroke(): void
  setLineDash(parts: number[]): void
  fillText(text: string, x: number, y: number): void
  strokeText(text: string, x: number, y: number): void
}

export function paintCanvas(pen: Pen, operations: readonly Operation[], theme: Theme): void {
  for (const operation of operations) painters[operation.shape](pen, operation as never, theme)
}

const fullTurn = 2 * Math.PI

const painters: {
  readonly [shape in Operation['shape']]: (pen: Pen, operation: never, theme: Theme) => void
} = {
  lines: (pen, operation: Lines, theme) => {
    pen.beginPath()
    for (const line of operation.lines) {
      if (line.length < 2) continue
      pen.moveTo(line[0]!, line[1]!)
      for (let i = 2; i + 1 < line.length; i += 2) pen.lineTo(line[i]!, line[i + 1]!)
      if (operation.isClosed) pen.closePath()
    }
    ink(pen, operation, theme)
  },
  discs: (pen, operation: Discs, theme) => {
    pen.beginPath()
    for (let i = 0; i < operation.discs.length; i += 3) {
      const [x, y, r] = [operation.discs[i]!, operation.discs[i + 1]!, operation.discs[i + 2]!]
      pen.moveTo(x + r, y)
      pen.arc(x, y, r, 0, fullTurn)
    }
    ink(pen, operation, theme)
  },
  words: (pen, operation: Words, theme) => {
    const { text, x, y, sizePx, anchor } = operation
    pen.font = `${operation.isBold ? '600 ' : ''}${sizePx}px ${fontFamily}`
    pen.textAlign = anchor === 'middle' ? 'center' : anchor
    pen.globalAlpha = 1
    if (operation.hasHalo) {
      pen.setLineDash([])
      pen.lineJoin = 'round'
      pen.lineWidth = sizePx / 4
      pen.strokeStyle = theme.paper
      pen.strokeText(text, x, y)
    }
    pen.fillStyle = theme[operation.ink]
    pen.fillText(text, x, y)
  },
}

function ink(pen: Pen, look: Look, theme: Theme): void {
  if (look.fill !== undefined) {
    pen.globalAlpha = look.fillOpacity ?? 1
    pen.fillStyle = theme[look.fill]
    pen.fill()
  }
  if (look.stroke === undefined) return
  pen.globalAlpha = look.strokeOpacity ?? 1
  pen.strokeStyle = theme[look.stroke]
  pen.lineWidth = look.widthPx ?? 1
  pen.lineCap = look.isRound ? 'round' : 'butt'
  pen.lineJoin = look.isRound ? 'round' : 'miter'
  pen.setLineDash(look.dashPx === undefined ? [] : [...look.dashPx])
  pen.stroke()
}
