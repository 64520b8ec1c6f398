// Where on the picture things land: a rectangle of pixels, a scale, a place, a camera. The whole way fits, or the view
// follows the machine at a scale that stays the same over the whole run.

import { type Box, type Point, sizeOf } from './boxes.js'
import { type Axes, axesOf, type Camera, dot, extentsOf } from './projection.js'
import type { Scene } from './scene.js'

export interface Rectangle {
  readonly leftPx: number
  readonly topPx: number
  readonly widthPx: number
  readonly heightPx: number
}

export interface View extends Rectangle {
  readonly pxPerM: number
  /** What lies at the rectangle's left upper corner, in metres along the picture's axes. */
  readonly originRightM: number
  readonly originUpM: number
  readonly axes: Axes
  /** Pixels for what is one pixel beside ordinary text of 16 pixels: drawings grow with the text around them. */
  readonly unit: number
  /** Finer lines where the links are short, bolder where they are long. */
  readonly lineFactor: number
}

/** Room inside the rectangle that the machine leaves free, for axis, scale bar and time. */
export interface Insets {
  readonly leftPx: number
  readonly rightPx: number
  readonly topPx: number
  readonly bottomPx: number
}

/** The largest scale at which the box fits into the rectangle, in the middle of it. */
export function fitBox(
  box: Box,
  scene: Scene,
  camera: Camera,
  rectangle: Rectangle,
  insets: Insets,
  unit: number,
): View {
  const axes = axesOf(camera)
  const { left, right, bottom, top } = extentsOf(box, axes)
  const wide = Math.max(1, rectangle.widthPx - insets.leftPx - insets.rightPx)
  const high = Math.max(1, rectangle.heightPx - insets.topPx - insets.bottomPx)
  const least = Math.max(1e-9, sizeOf(box) * 1e-6)
  const pxPerM = Math.min(wide / Math.max(least, right - left), high / Math.max(least, top - bottom))
  const middleX = rectangle.widthPx / 2 + (insets.leftPx - insets.rightPx) / 2
  const middleY = rectangle.heightPx / 2 + (insets.topPx - insets.bottomPx) / 2
  return {
    ...rectangle,
    pxPerM,
    originRightM: (left + right) / 2 - middleX / pxPerM,
    originUpM: (bottom + top) / 2 + middleY / pxPerM,
    axes,
    unit,
    lineFactor: lineFactor(scene, pxPerM, unit),
  }
}

/** A strut of 44 pixels gets the ordinary line weights. */
export function lineFactor({ meanLinkM }: Scene, pxPerM: number, unit: number): number {
  if (meanLinkM === 0) return 1
  return Math.min(1.5, Math.max(0.6, (meanLinkM * pxPerM) / (44 * unit)))
}

/** Room around a followed machine, in parts of its own length. */
const roomAround = 0.3

/**
 * The box to show around the machine at a time (in frames): along and across it goes with the machine where the way is
 * longer than the room around it; up and down it stays, unless the way climbs far.
 */
export function followBox(scene: Scene, at: number): Box {
  const { wayBox, ownWayBox, machineBox } = scene
  const long = machineBox.high[0] - machineBox.low[0]
  const room: Point = [roomAround * long, 0, 0]
  const low: number[] = []
  const high: number[] = []
  for (let axis = 0; axis < 3; axis++) {
    const own = machineBox.high[axis]! - machineBox.low[axis]! + 2 * room[axis]!
    const way = wayBox.high[axis]! - wayBox.low[axis]!
    const climb = ownWayBox.high[1] - ownWayBox.low[1]
    const follows = axis === 1 ? climb > 4 * own : way > own
    const middle = middleAt(scene, at, axis)
    low.push(follows ? middle + machineBox.low[axis]! - room[axis]! : wayBox.low[axis]!)
    high.push(follows ? middle + machineBox.high[axis]! + room[axis]! : wayBox.high[axis]!)
  }
  return { low: [low[0]!, low[1]!, low[2]!], high: [high[0]!, high[1]!, high[2]!] }
}

function middleAt({ middlesM, lastFrame }: Scene, at: number, axis: number): number {
  const before = Math.floor(at)
  const after = Math.min(lastFrame, before + 1)
  const from = middlesM[3 * before + axis]!
  return from + (at - before) * (middlesM[3 * after + axis]! - from)
}

/** A place of the world in pixels. */
export function pxOf(view: View, x: number, y: number, z: number): [number, number] {
  const { axes, pxPerM } = view
  return [
    view.leftPx + (dot(axes.right, x, y, z) - view.originRightM) * pxPerM,
    view.topPx + (view.originUpM - dot(axes.up, x, y, z)) * pxPerM,
  ]
}

/** How near to the viewer a place is, in metres along the line of sight. */
export function nearness(view: View, x: number, y: number, z: number): number {
  return dot(view.axes.near, x, y, z)
}
