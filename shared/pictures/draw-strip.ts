// The run over time below the drawing: one lane for each group of actuators and each motor (drive, up is longer), and
// one for contact, with a row for every node that ever touches.

import type { Frames } from '../frames.js'
import { activeInk } from './looks.js'
import type { Operation } from './operations.js'
import type { Scene } from './scene.js'
import { dashes, type Ink } from './style.js'
import type { Rectangle } from './view.js'

export interface Lane {
  readonly label: string
  readonly ink: Ink
  readonly dash: readonly number[]
  /** Value of each frame, -1 to 1. */
  readonly values: Float64Array
}

/** Links of a kind are driven alike; where they are not, their mean is shown. */
export function driveLanes({ kinds, frames }: Scene): Lane[] {
  const groups = kinds
    .filter(({ isActive }) => isActive)
    .map(({ kind, ink, dash, drives }) => {
      const own = drives.filter((values) => values !== undefined)
      const values = Float64Array.from(
        frames.positions,
        (_, frame) => own.reduce((sum, series) => sum + series[frame]!, 0) / own.length,
      )
      return { label: kind, ink, dash, values }
    })
  const motors = (frames.motors ?? []).map(({ label, values }, place) => ({
    label,
    ink: activeInk(place),
    dash: dashes[place % dashes.length]!,
    values,
  }))
  return [...groups, ...motors]
}

/** Nodes that touch something at some times and not at others. */
export function touchingNodes({ contacts }: Frames): number[] {
  const [first, ...others] = contacts ?? []
  if (first === undefined) return []
  const nodes = Array.from(first, (_, node) => node)
  return nodes.filter((node) => others.some((frame) => frame[node] !== first[node]))
}

export const lanePx = 30
/** Rows for contact: this high, or lower where there are many. */
const rowMostPx = 5
const rowsMostPx = 66

/** How high a strip wants to be; 0 where there is nothing to show. */
export function stripHeightPx(scene: Scene, unit: number): number {
  return (driveLanes(scene).length * lanePx + contactHeight(scene)) * unit
}

function contactHeight({ frames }: Scene): number {
  const rows = touchingNodes(frames).length
  return rows === 0 ? 0 : Math.max(lanePx - 6, rows * rowHeightPx(rows)) + 6
}

function rowHeightPx(rows: number): number {
  return Math.min(rowMostPx, rowsMostPx / rows)
}

/** Where the time axis begins, so that a cursor can be put over it. */
export function stripFromPx({ widthPx }: Pick<Rectangle, 'widthPx'>, unit: number): number {
  return Math.min(132 * unit, 0.34 * widthPx)
}

/** All lanes over the whole run. */
export function drawStrip(scene: Scene, rectangle: Rectangle, unit: number): Operation[] {
  const from = rectangle.leftPx + stripFromPx(rectangle, unit)
  const wide = rectangle.leftPx + rectangle.widthPx - 2 * unit - from
  const perFrame = wide / Math.max(1, scene.lastFrame)
  const lanes = driveLanes(scene)
  const operations = lanes.flatMap((lane, place): Operation[] => {
    const middle = rectangle.topPx + (place + 0.5) * lanePx * unit
    const curve = Array.from(lane.values, (value, frame) => [
      from + frame * perFrame,
      middle - value * 0.38 * lanePx * unit,
    ]).flat()
    return [
      name(lane.label, rectangle, middle, unit),
      {
        shape: 'lines',
        role: 'strip',
        lines: [[from, middle, from + wide, middle]],
        stroke: 'grid',
        widthPx: unit,
      },
      {
        shape: 'lines',
        role: 'strip',
        lines: [curve],
        stroke: lane.ink,
        widthPx: 2 * unit,
        ...(lane.dash.length > 0 ? { dashPx: lane.dash.map((part) => 2 * unit * part) } : {}),
      },
    ]
  })
  const top = rectangle.topPx + lanes.length * lanePx * unit + 3 * unit
  return [...operations, ...contactLane(scene, rectangle, { from, perFrame, top, unit })]
}

interface Time {
  readonly from: number
  readonly perFrame: number
  readonly top: number
  readonly unit: number
}

function contactLane(scene: Scene, rectangle: Rectangle, { from, perFrame, top, unit }: Time): Operation[] {
  const { contacts } = scene.frames
  const nodes = touchingNodes(scene.frames)
  if (contacts === undefined || nodes.length === 0) return []
  const rowPx = rowHeightPx(nodes.length)
  const lines: number[][] = []
  for (const [row, node] of nodes.entries()) {
    const y = top + (row + 0.5) * rowPx * unit
    for (let frame = 0; frame < contacts.length; ) {
      const start = frame
      while (frame < contacts.length && contacts[frame]![node] === 1) frame++
      if (frame > start)
        lines.push([from + start * perFrame, y, from + Math.min(frame - 0.2, scene.lastFrame) * perFrame, y])
      else frame++
    }
  }
  const middle = top + (nodes.length * rowPx * unit) / 2
  const label = nodes.length === 1 ? 'contact' : `contact, ${nodes.length} nodes`
  return [
    name(label, rectangle, middle, unit),
    { shape: 'lines', role: 'strip', lines, stroke: 'contact', widthPx: 0.6 * rowPx * unit },
  ]
}

function name(text: string, { leftPx }: Rectangle, middle: number, unit: number): Operation {
  const sizePx = 13 * unit
  return {
    shape: 'words',
    role: 'strip',
    text,
    x: leftPx,
    y: middle + 0.35 * sizePx,
    sizePx,
    ink: 'ink',
    anchor: 'start',
  }
}
