// What makes a drawing readable: axis, scale bar, time, directions in 3-D, words at places, and the drives of motors.

import { cos, sin } from '../detmath/trigonometry.js'
import { activeInk } from './looks.js'
import { decimalsOf, lengthText, roundStep, roundStepUp, timeText } from './measure.js'
import type { Moment } from './moment.js'
import type { Operation, Words } from './operations.js'
import type { Scene } from './scene.js'
import { pxOf, type Rectangle, type View } from './view.js'

export const furnitureTextPx = 13

function words(text: string, x: number, y: number, unit: number, more: Partial<Words> = {}): Words {
  return {
    shape: 'words',
    role: 'text',
    text,
    x,
    y,
    sizePx: furnitureTextPx * unit,
    ink: 'ink',
    anchor: 'start',
    ...more,
  }
}

/** Ticks along the lower edge, metres along the ground; with `lines`, faint lines up through a stack of moments. */
export function axisOperations(view: View, lines?: Rectangle): Operation[] {
  const { unit, pxPerM, originRightM, widthPx } = view
  const step = roundStepUp(Math.max((66 * unit) / pxPerM, widthPx / pxPerM / 14))
  const decimals = decimalsOf(step)
  const bottom = view.topPx + view.heightPx
  const edge = 24 * unit
  const ticks: number[][] = []
  const up: number[][] = []
  const numbers: Operation[] = []
  for (let tick = Math.ceil(originRightM / step); tick * step <= originRightM + widthPx / pxPerM; tick++) {
    const x = view.leftPx + (tick * step - originRightM) * pxPerM
    if (x < view.leftPx + edge || x > view.leftPx + widthPx - edge) continue
    ticks.push([x, bottom - 22 * unit, x, bottom - 17 * unit])
    if (lines !== undefined) up.push([x, lines.topPx, x, bottom - 22 * unit])
    const text = `${(tick * step).toFixed(decimals)} m`
    numbers.push(words(text, x, bottom - 5 * unit, unit, { role: 'axis', ink: 'faint', anchor: 'middle' }))
  }
  return [
    { shape: 'lines', role: 'axis', lines: up, stroke: 'faint', strokeOpacity: 0.16, widthPx: unit },
    { shape: 'lines', role: 'axis', lines: ticks, stroke: 'faint', widthPx: unit },
    ...numbers,
  ]
}

/** The length that a scale bar stands for: round, and about a fifth of what the view shows. */
export function scaleBarM(view: View): number {
  return roundStep((0.22 * view.widthPx) / view.pxPerM)
}

/** In the right upper corner, with its length. */
export function scaleBarOperations(scene: Scene, view: View): Operation[] {
  const { unit } = view
  const metres = scaleBarM(view)
  const right = view.leftPx + view.widthPx - 12 * unit
  const [top, bottom] = [view.topPx + 10 * unit, view.topPx + 19 * unit]
  const left = right - metres * view.pxPerM
  const label = scene.frames.dimensions === 3 ? `${lengthText(metres)} across the view` : lengthText(metres)
  return [
    {
      shape: 'lines',
      role: 'scale',
      lines: [[left, top, left, bottom, right, bottom, right, top]],
      stroke: 'ink',
      widthPx: 2 * unit,
    },
    words(label, left - 8 * unit, bottom + unit, unit, { role: 'scale', anchor: 'end', hasHalo: true }),
  ]
}

/** In the left upper corner; below it what the problem wants to be said. */
export function timeOperations({ frames }: Scene, { at }: Moment, view: View): Operation[] {
  const { unit, leftPx, topPx } = view
  const text = timeText(at * frames.secondsPerFrame, frames.secondsPerFrame, 2)
  const [x, y] = [leftPx + 12 * unit, topPx + 20 * unit]
  return [
    words(text, x, y, unit, { role: 'time', isBold: true, hasHalo: true }),
    ...noteOperations(frames.note, x, y + 1.5 * furnitureTextPx * unit, unit),
  ]
}

export function noteOperations(note: string | undefined, x: number, y: number, unit: number): Operation[] {
  return note === undefined ? [] : [words(note, x, y, unit, { role: 'note', hasHalo: true })]
}

const directions = [
  ['x', 'along'],
  ['y', 'up'],
  ['z', 'across'],
] as const

/** Three short arrows in the left lower corner: which way along, up and across go. */
export function tripodOperations(view: View): Operation[] {
  const { unit, axes } = view
  const long = 26 * unit
  const [x0, y0] = [view.leftPx + 46 * unit, view.topPx + view.heightPx - 40 * unit]
  const arms = directions.map((_, i) => [axes.right[i]! * long, -axes.up[i]! * long] as const)
  const letters = arms.flatMap(([dx, dy], i): Operation[] => {
    const length = Math.sqrt(dx * dx + dy * dy)
    // An arrow that points at the viewer has no direction to write beside.
    if (length < 0.3 * long) return []
    const out = (length + 9 * unit) / length
    const look = { role: 'axis', ink: 'faint', anchor: 'middle' } as const
    return [words(directions[i]![0], x0 + dx * out, y0 + dy * out + 4 * unit, unit, look)]
  })
  const lines = arms.map(([dx, dy]) => [x0, y0, x0 + dx, y0 + dy])
  return [{ shape: 'lines', role: 'axis', lines, stroke: 'faint', widthPx: 1.5 * unit }, ...letters]
}

export function labelOperations({ frames }: Scene, view: View): Operation[] {
  return (frames.labels ?? []).flatMap(({ text, atM }) => {
    const [x, y] = pxOf(view, atM[0]!, atM[1]!, atM[2] ?? 0)
    const isInside =
      x >= view.leftPx &&
      x <= view.leftPx + view.widthPx &&
      y >= view.topPx &&
      y <= view.topPx + view.heightPx
    return isInside ? [words(text, x, y, view.unit, { role: 'label', anchor: 'middle', hasHalo: true })] : []
  })
}

/** Most of a turn that a motor's arc goes at full drive. */
const arcMostRad = 4.2
const arcPieces = 18

/** A ring around the joint; on it an arc with a head, the longer the harder the drive, the way it turns. */
export function motorOperations(
  { frames }: Scene,
  moment: Moment,
  view: View,
  nodes: Float64Array,
): Operation[] {
  return (frames.motors ?? []).flatMap(({ node, values, slidesFrom }, place) => {
    const [x, y] = [nodes[3 * node]!, nodes[3 * node + 1]!]
    if (slidesFrom !== undefined) {
      const [dx, dy] = [x - nodes[3 * slidesFrom]!, y - nodes[3 * slidesFrom + 1]!]
      return slideAt(x, y, [dx, dy], moment.valueOf(values), place, view.unit)
    }
    return motorAt(
      x,
      y,
      moment.valueOf(values),
      12 * view.unit * Math.max(0.8, view.lineFactor),
      place,
      view.unit,
    )
  })
}

export function motorAt(
  x: number,
  y: number,
  drive: number,
  radiusPx: number,
  place: number,
  unit: number,
): Operation[] {
  const stroke = activeInk(place)
  const ring: Operation = { shape: 'discs', role: 'motor', discs: [x, y, radiusPx], stroke, widthPx: unit }
  const turn = arcMostRad * drive
  if (Math.abs(turn) < 0.05) return [ring]
  const at = (angle: number, radius: number) => [x - radius * sin(angle), y - radius * cos(angle)] as const
  const arc: number[] = []
  for (let i = 0; i <= arcPieces; i++) arc.push(...at((turn * i) / arcPieces, radiusPx))
  const back = turn - (Math.sign(turn) * 5 * unit) / radiusPx
  const head = [...at(back, radiusPx + 4 * unit), ...at(turn, radiusPx), ...at(back, radiusPx - 4 * unit)]
  return [
    ring,
    { shape: 'lines', role: 'motor', lines: [arc, head], stroke, widthPx: 2.6 * unit, isRound: true },
  ]
}

/** Two rails beside the joint; between them an arrow, the longer the harder the drive, out or in. */
export function slideAt(
  x: number,
  y: number,
  [dx, dy]: readonly [number, number],
  drive: number,
  place: number,
  unit: number,
): Operation[] {
  const length = Math.sqrt(dx * dx + dy * dy)
  const [alongX, alongY] = length > 0 ? [dx / length, dy / length] : [1, 0]
  const at = (along: number, aside: number) =>
    [x + unit * (along * alongX - aside * alongY), y + unit * (along * alongY + aside * alongX)] as const
  const look = { shape: 'lines', role: 'motor', stroke: activeInk(place) } as const
  const rails = [-1, 1].map((side) => [...at(-14, 9 * side), ...at(14, 9 * side)])
  const tip = 24 * drive
  const back = tip - 5 * Math.sign(drive)
  const arrow = [
    [...at(0, 0), ...at(tip, 0)],
    [...at(back, -4), ...at(tip, 0), ...at(back, 4)],
  ]
  return [
    { ...look, lines: rails, widthPx: unit },
    { ...look, lines: Math.abs(drive) < 0.02 ? [] : arrow, widthPx: 2.6 * unit, isRound: true },
  ]
}
