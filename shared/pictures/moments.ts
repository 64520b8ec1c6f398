// Stills: moments of a run on one common scale, below each other so that the way reads from top to bottom, or in columns
// where the way is short.

import type { Frames } from '../frames.js'
import type { Box } from './boxes.js'
import { drawMoment } from './draw.js'
import {
  axisOperations,
  furnitureTextPx,
  noteOperations,
  scaleBarOperations,
  tripodOperations,
} from './draw-furniture.js'
import type { LegendRow } from './legend.js'
import { sampleHeightPx, sampleWidthPx } from './legend.js'
import { momentsOf, secondsAt, timeText } from './measure.js'
import { momentAt } from './moment.js'
import { type Operation, textWidthPx } from './operations.js'
import { axesOf, type Camera, extentsOf, sideCamera, startCamera } from './projection.js'
import type { Scene } from './scene.js'
import { fitBox, type Insets, type View } from './view.js'

export interface Sheet {
  readonly operations: readonly Operation[]
  readonly heightPx: number
}
export interface MomentsSheet extends Sheet {
  /** Which frames are shown. */
  readonly shown: readonly number[]
}

export interface SheetPlace {
  readonly leftPx: number
  readonly topPx: number
  readonly widthPx: number
  /** As in View. */
  readonly unit: number
}

/** Times of shown frames, told apart. */
export function momentTimes(frames: Frames, shown: readonly number[]): string[] {
  const apart = secondsAt(frames, shown.at(-1)! - shown[0]!) / Math.max(1, shown.length - 1)
  return shown.map((frame) => timeText(secondsAt(frames, frame), shown.length > 1 ? apart : 1, 1))
}

/** Moments shown, by the number of columns they stand in. */
const momentsByColumns = [5, 4, 6] as const
const timePx = 64
const gapPx = 26
/** Moments stand side by side where that keeps this much of the scale. */
const besideShare = 0.65
/** Of a row of long ways and of tall machines. */
const [rowLongPx, rowTallPx] = [230, 340] as const
const axisPx = 30
const scalePx = 30

interface Cells {
  readonly pxPerM: number
  readonly plotPx: number
  readonly rowPx: number
  readonly columns: number
  readonly insets: Insets
  readonly box: Box
  readonly camera: Camera
}

export function drawMoments(scene: Scene, place: SheetPlace): MomentsSheet {
  const { unit } = place
  const cells = cellsOf(scene, place)
  const shown = momentsOf(scene.frames, momentsByColumns[cells.columns - 1]!)
  const top = place.topPx + scalePx * unit
  const columnPx = timePx * unit + cells.plotPx + gapPx * unit
  const viewOf = (index: number): View => {
    const [column, row] = [index % cells.columns, Math.floor(index / cells.columns)]
    const rectangle = {
      leftPx: place.leftPx + column * columnPx + timePx * unit,
      topPx: top + row * (cells.rowPx + 10 * unit),
      widthPx: cells.plotPx,
      heightPx: cells.rowPx,
    }
    return fitBox(cells.box, scene, cells.camera, rectangle, cells.insets, unit)
  }
  const views = shown.map((_, index) => viewOf(index))
  const last = views[views.length - 1]!
  const bottom = last.topPx + last.heightPx
  const under = Array.from({ length: Math.min(cells.columns, shown.length) }, (_, column) => views[column]!)
  const isFlat = scene.frames.dimensions === 2
  const times = momentTimes(scene.frames, shown)
  const noteAt = place.topPx + 20 * unit
  const axes = under.flatMap((view) =>
    axisOperations({ ...view, topPx: bottom, heightPx: axisPx * unit }, { ...view, topPx: top, heightPx: 0 }),
  )
  const whole = { ...views[0]!, leftPx: place.leftPx, widthPx: place.widthPx, topPx: place.topPx }
  return {
    shown,
    operations: [
      ...(isFlat ? axes : tripodOperations({ ...last, leftPx: place.leftPx, topPx: bottom - last.heightPx })),
      ...shown.flatMap((frame, index) => momentOperations(scene, frame, times[index]!, views[index]!)),
      ...noteOperations(scene.frames.note, place.leftPx, noteAt, unit),
      ...scaleBarOperations(scene, whole),
    ],
    heightPx: bottom + (isFlat ? axisPx * unit : 0) - place.topPx,
  }
}

function cellsOf(scene: Scene, place: SheetPlace): Cells {
  const { unit } = place
  const { dimensions } = scene.frames
  const camera = dimensions === 3 ? startCamera : sideCamera
  const box = scene.wayBox
  const { left, right, bottom, top } = extentsOf(box, axesOf(camera))
  const [wideM, highM] = [Math.max(1e-9, right - left), Math.max(1e-9, top - bottom)]
  const insets = { leftPx: 12 * unit, rightPx: 12 * unit, topPx: 10 * unit, bottomPx: 18 * unit }
  const [besides, above] = [insets.leftPx + insets.rightPx, insets.topPx + insets.bottomPx]
  const isSingle = scene.lastFrame === 0
  const rowRoomPx = (isSingle ? 1.5 : 1) * rowMostPx(highM / wideM) * unit - above
  const scaleFor = (columns: number) => {
    const cellPx = (place.widthPx + gapPx * unit) / columns - gapPx * unit
    return Math.min((cellPx - timePx * unit - besides) / wideM, rowRoomPx / highM)
  }
  const possible = isSingle ? [1] : momentsByColumns.map((_, i) => i + 1)
  const columns = possible.findLast((count) => scaleFor(count) >= besideShare * scaleFor(1)) ?? 1
  const pxPerM = scaleFor(columns)
  const plotPx = wideM * pxPerM + besides
  return { pxPerM, plotPx, rowPx: highM * pxPerM + above, columns, insets, box, camera }
}

function rowMostPx(tallness: number): number {
  return rowLongPx + (rowTallPx - rowLongPx) * Math.min(1, Math.max(0, (tallness - 0.3) / 0.3))
}

const inStills = { showsWay: true, hasAxis: false, hasScaleBar: false, hasTime: false } as const

function momentOperations(scene: Scene, frame: number, text: string, view: View): Operation[] {
  const sizePx = 1.15 * furnitureTextPx * view.unit
  return [
    {
      shape: 'words',
      role: 'time',
      text,
      x: view.leftPx - timePx * view.unit,
      y: view.topPx + view.heightPx / 2,
      sizePx,
      ink: 'ink',
      anchor: 'start',
      isBold: true,
    },
    ...drawMoment(scene, momentAt(scene.frames, frame), view, inStills),
  ]
}

/** Legend rows side by side, in as many lines as they need. */
export function drawLegend(rows: readonly LegendRow[], { leftPx, topPx, widthPx, unit }: SheetPlace): Sheet {
  const sizePx = furnitureTextPx * unit
  const linePx = (sampleHeightPx + 6) * unit
  let [x, y] = [leftPx, topPx]
  const operations: Operation[] = []
  for (const { sample, words } of rows) {
    const wide = (sampleWidthPx + 8) * unit + textWidthPx(words, sizePx) + 18 * unit
    if (x > leftPx && x + wide > leftPx + widthPx) {
      x = leftPx
      y += linePx
    }
    operations.push(...sample.map((operation) => placed(operation, x, y, unit)), {
      shape: 'words',
      role: 'text',
      text: words,
      x: x + (sampleWidthPx + 8) * unit,
      y: y + (sampleHeightPx / 2) * unit + 0.35 * sizePx,
      sizePx,
      ink: 'ink',
      anchor: 'start',
    })
    x += wide
  }
  return { operations, heightPx: y + linePx - topPx }
}

/** A sample moved and made larger. */
function placed(operation: Operation, x: number, y: number, by: number): Operation {
  const at = (value: number, i: number) => (i % 2 === 0 ? x : y) + by * value
  if (operation.shape === 'words')
    return { ...operation, x: x + by * operation.x, y: y + by * operation.y, sizePx: by * operation.sizePx }
  const look = {
    ...(operation.widthPx === undefined ? {} : { widthPx: by * operation.widthPx }),
    ...(operation.dashPx === undefined ? {} : { dashPx: operation.dashPx.map((part) => by * part) }),
  }
  if (operation.shape === 'lines')
    return { ...operation, ...look, lines: operation.lines.map((one) => one.map(at)) }
  const discs = operation.discs.map((value, i) =>
    i % 3 === 2 ? by * value : (i % 3 === 0 ? x : y) + by * value,
  )
  return { ...operation, ...look, discs }
}
