// The best machine as one SVG file: moments of its run below each other on a common scale, so that its way reads
// from top to bottom; axes, scale bar, legend, the path of what it carries, result with its uncertainty, cautions in
// full. No script, no font file, no network.

import { check } from '../../../shared/check.js'
import type { Frames } from '../../../shared/problem.js'
import { alwaysCaution, cautionText, escaped, type PictureFacts, resultSentence, titleOf } from './facts.js'
import {
  type Extent,
  extentOf,
  framesFault,
  kindsOf,
  lengthText,
  momentsOf,
  nodeAt,
  nodeCount,
  roundStep,
  roundStepUp,
  secondsAt,
} from './geometry.js'
import { colourOf, fontFamily, type LinkStyle, light, linkStyles } from './style.js'

const widthPx = 1200
const marginPx = 44
const timePx = 76
/** Moments shown, by number of columns they stand in. */
const momentsByColumns = [5, 4, 6] as const
const gapPx = 28
const rowHeightMostPx = 210
/** Least distance between ticks: room for their numbers. */
const tickPx = 60
const theme = light

interface Scale {
  readonly pxPerM: number
  readonly extent: Extent
  readonly rowPx: number
  readonly leftPx: number
  readonly plotPx: number
  /** Moments side by side, where the way is short. */
  readonly columns: number
}

/** The picture as SVG text. The frames must be sound (framesFault). */
export function bestSvg(frames: Frames, facts: PictureFacts): string {
  check(framesFault(frames) === undefined, 'frames were checked before they are drawn')
  const styles = linkStyles(kindsOf(frames))
  const scale = scaleOf(frames)
  const moments = momentsOf(frames, momentsByColumns[scale.columns - 1]!)
  const head = headLines(facts)
  let y = marginPx
  const parts: string[] = []
  const add = (part: string, heightPx: number) => {
    parts.push(part)
    y += heightPx
  }
  add(text(marginPx, y + 10, titleOf(facts), 26, theme.ink, 'font-weight="600"'), 30)
  for (const line of head) add(text(marginPx, y + 14, line, 16, theme.ink), 23)
  add(legend(styles, frames, y + 22), 50)
  const top = y
  for (const [index, frame] of moments.entries()) {
    const cell = cellOf(scale, index % scale.columns)
    add(moment(frames, styles, cell, frame, top + Math.floor(index / scale.columns) * scale.rowPx), 0)
  }
  y += Math.ceil(moments.length / scale.columns) * scale.rowPx
  for (let column = 0; column < Math.min(scale.columns, moments.length); column++)
    add(axis(cellOf(scale, column), top, y), 0)
  add(scaleBar(scale, y), 62)
  for (const block of foot(facts)) {
    const drawn = paragraph(block, y)
    add(drawn.part, drawn.heightPx)
  }
  const heightPx = Math.ceil(y + marginPx / 2)
  const alternative = `${titleOf(facts)}: ${resultSentence(facts)} Shown: ${facts.shown}, at ${moments.map((frame) => `${secondsAt(frames, frame).toFixed(1)} s`).join(', ')}.`
  return `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 ${widthPx} ${heightPx}" width="${widthPx}" height="${heightPx}" style="max-width:100%;height:auto" role="img" aria-labelledby="title description" font-family="${escaped(fontFamily)}">
<title id="title">${escaped(titleOf(facts))}</title>
<desc id="description">${escaped(alternative)}</desc>
<rect width="${widthPx}" height="${heightPx}" fill="${theme.paper}"/>
${parts.join('\n')}
</svg>
`
}

/** One scale for both axes and all moments: the whole way fits the width, a row stays low enough to read. */
function scaleOf(frames: Frames): Scale {
  const all = frames.positions.map((_, index) => index)
  const body = extentOf(frames, all)
  const inside = frames.ground.filter(([x]) => x >= body.left && x <= body.right).map(([, y]) => y)
  const margin = 0.04 * Math.max(body.right - body.left, body.top - body.bottom, 1e-6)
  const extent = {
    left: body.left - margin,
    right: body.right + margin,
    bottom: Math.min(body.bottom, ...inside) - margin,
    top: Math.max(body.top, ...inside) + margin,
  }
  const roomPx = widthPx - 2 * marginPx
  const [wideM, highM] = [extent.right - extent.left, extent.top - extent.bottom]
  // A single moment may be taller.
  const rowMostPx = all.length === 1 ? 2 * rowHeightMostPx : rowHeightMostPx
  const pxPerM = Math.min((roomPx - timePx) / wideM, rowMostPx / highM)
  const cellPx = timePx + wideM * pxPerM
  const columns = Math.min(
    momentsByColumns.length,
    Math.max(1, Math.floor((roomPx + gapPx) / (cellPx + gapPx))),
  )
  return { pxPerM, extent, rowPx: highM * pxPerM, leftPx: marginPx + timePx, plotPx: wideM * pxPerM, columns }
}

/** The same scale, moved to a column. */
function cellOf(scale: Scale, column: number): Scale {
  return { ...scale, leftPx: scale.leftPx + column * (scale.plotPx + timePx + gapPx) }
}

function moment(
  frames: Frames,
  styles: readonly LinkStyle[],
  scale: Scale,
  frame: number,
  topPx: number,
): string {
  const at = ([x, y]: readonly [number, number]) =>
    [
      scale.leftPx + (x - scale.extent.left) * scale.pxPerM,
      topPx + (scale.extent.top - y) * scale.pxPerM,
    ] as const
  const parts = [groundPart(frames, scale, at, topPx), ...markerParts(frames, frame, scale, at)]
  for (const style of styles) {
    const strokes = frames.links
      .filter(({ kind }) => kind === style.kind)
      .map(({ a, b }) => `M${point(at(nodeAt(frames, frame, a)))}L${point(at(nodeAt(frames, frame, b)))}`)
    const dash =
      style.dash.length > 0
        ? ` stroke-dasharray="${style.dash.map((part) => part * style.width).join(' ')}"`
        : ''
    parts.push(
      `<path d="${strokes.join('')}" fill="none" stroke="${colourOf(theme, style)}" stroke-width="${style.width}"${dash}/>`,
    )
  }
  for (let node = 0; node < nodeCount(frames); node++) {
    const [x, y] = at(nodeAt(frames, frame, node))
    const radius = Math.max(2, frames.nodeRadiiM[node]! * scale.pxPerM)
    parts.push(
      `<circle cx="${px(x)}" cy="${px(y)}" r="${px(Math.min(radius, 9))}" fill="${theme.paper}" stroke="${theme.ink}" stroke-width="1.2"/>`,
    )
  }
  const middle = topPx + scale.rowPx / 2
  return `<g>${text(scale.leftPx - timePx, middle, `${secondsAt(frames, frame).toFixed(1)} s`, 17, theme.ink, 'font-weight="600"')}${parts.join('')}</g>`
}

/** Behind the links, so that what carries a marker stays visible; then where it has been. */
function markerParts(frames: Frames, frame: number, scale: Scale, at: At): string[] {
  const discs = frames.markers.map(({ node, radiusM }) => {
    const [x, y] = at(nodeAt(frames, frame, node))
    const radius = px(Math.max(5, radiusM * scale.pxPerM))
    return `<circle cx="${px(x)}" cy="${px(y)}" r="${radius}" fill="${theme.marker}" fill-opacity="0.35" stroke="${theme.marker}" stroke-width="2"/>`
  })
  return [...discs, ...frames.markers.map(({ node }) => pathPart(frames, node, frame, at))]
}

type At = (point: readonly [number, number]) => readonly [number, number]

/** The outline of the ground, cut at the edges of the plot. */
function groundPart(frames: Frames, scale: Scale, at: At, topPx: number): string {
  const { left, right } = scale.extent
  const cut = clipped(frames.ground, left, right)
  if (cut.length < 2) return ''
  const line = cut.map((one) => point(at(one))).join('L')
  const bottom = px(topPx + scale.rowPx - 6)
  const [first] = at(cut[0]!)
  const [last] = at(cut[cut.length - 1]!)
  return `<path d="M${line}L${px(last)},${bottom}L${px(first)},${bottom}Z" fill="${theme.groundFill}"/><path d="M${line}" fill="none" stroke="${theme.ground}" stroke-width="2"/>`
}

/** Points of a line that runs left to right, between two x, with points added at the cuts. */
export function clipped(
  line: readonly (readonly [number, number])[],
  left: number,
  right: number,
): (readonly [number, number])[] {
  const inside: (readonly [number, number])[] = []
  for (let i = 0; i < line.length; i++) {
    const [x, y] = line[i]!
    const before = line[i - 1]
    for (const edge of [left, right]) {
      if (before && before[0] < edge && x > edge) {
        inside.push([edge, before[1] + ((edge - before[0]) / (x - before[0])) * (y - before[1])])
      }
    }
    if (x >= left && x <= right) inside.push([x, y])
  }
  return inside.sort((a, b) => a[0] - b[0])
}

/** Where a marked node has been up to this frame. */
function pathPart(frames: Frames, node: number, last: number, at: At): string {
  if (last === 0) return ''
  const stride = Math.max(1, Math.floor(last / 400))
  const points: string[] = []
  for (let frame = 0; frame < last; frame += stride) points.push(point(at(nodeAt(frames, frame, node))))
  points.push(point(at(nodeAt(frames, last, node))))
  return `<path d="M${points.join('L')}" fill="none" stroke="${theme.path}" stroke-width="1.3"/>`
}

/** Horizontal axis with ticks in metres, and faint lines up through all rows. */
function axis(scale: Scale, topPx: number, y: number): string {
  const { left, right } = scale.extent
  const step = roundStepUp(Math.max(((right - left) * tickPx) / scale.plotPx, (right - left) / 12))
  const decimals = Math.max(0, -Math.floor(Math.log10(step) + 1e-9))
  const parts = [
    `<path d="M${px(scale.leftPx)},${px(y)}H${px(scale.leftPx + scale.plotPx)}" stroke="${theme.faint}"/>`,
  ]
  for (let tick = Math.ceil(left / step); tick * step <= right; tick++) {
    const x = scale.leftPx + (tick * step - left) * scale.pxPerM
    parts.push(`<path d="M${px(x)},${px(y)}v6" stroke="${theme.faint}"/>`)
    parts.push(`<path d="M${px(x)},${px(topPx)}V${px(y)}" stroke="${theme.faint}" stroke-opacity="0.14"/>`)
    parts.push(text(x, y + 22, (tick * step).toFixed(decimals), 14, theme.faint, 'text-anchor="middle"'))
  }
  return parts.join('')
}

/** Holds along and across; with the words for the axis. */
function scaleBar(scale: Scale, y: number): string {
  const bar = roundStep(scale.plotPx / scale.pxPerM / 4)
  const barPx = bar * scale.pxPerM
  const from = widthPx - marginPx - barPx
  return [
    `<path d="M${px(from)},${px(y + 36)}v10h${px(barPx)}v-10" fill="none" stroke="${theme.ink}" stroke-width="2"/>`,
    text(from - 8, y + 46, lengthText(bar), 14, theme.ink, 'text-anchor="end"'),
    text(scale.leftPx, y + 44, 'along the ground, m (height on the same scale)', 14, theme.faint),
  ].join('')
}

function legend(styles: readonly LinkStyle[], frames: Frames, y: number): string {
  let x = marginPx
  const parts: string[] = []
  const label = (name: string) => {
    parts.push(text(x, y + 5, name, 15, theme.ink))
    x += 14 + Math.max(30, name.length * 8.2)
  }
  for (const style of styles) {
    const dash =
      style.dash.length > 0
        ? ` stroke-dasharray="${style.dash.map((part) => part * style.width).join(' ')}"`
        : ''
    parts.push(
      `<path d="M${px(x)},${px(y)}h38" stroke="${colourOf(theme, style)}" stroke-width="${style.width}"${dash}/>`,
    )
    x += 46
    label(style.kind)
  }
  for (const { label: name } of frames.markers.slice(0, 3)) {
    parts.push(
      `<circle cx="${px(x + 8)}" cy="${px(y)}" r="7" fill="${theme.marker}" fill-opacity="0.35" stroke="${theme.marker}" stroke-width="2"/>`,
    )
    x += 22
    label(name)
    parts.push(`<path d="M${px(x)},${px(y)}h38" stroke="${theme.path}" stroke-width="1.3"/>`)
    x += 46
    label('its path')
  }
  return parts.join('')
}

interface Block {
  readonly title: string
  readonly paragraphs: readonly string[]
  readonly isCaution: boolean
}

function foot(facts: PictureFacts): Block[] {
  const blocks: Block[] = [
    { title: 'Cautions', paragraphs: [...facts.cautions.map(cautionText), alwaysCaution], isCaution: true },
  ]
  if (facts.description.length > 0)
    blocks.push({ title: 'Machine', paragraphs: facts.description, isCaution: false })
  if (facts.provenance.length > 0)
    blocks.push({ title: 'Origin', paragraphs: facts.provenance, isCaution: false })
  return blocks
}

function headLines(facts: PictureFacts): string[] {
  return [...wrapped(resultSentence(facts), 128), ...wrapped(`Shown: ${facts.shown}.`, 128)]
}

function paragraph(block: Block, y: number): { readonly part: string; readonly heightPx: number } {
  const lines = block.paragraphs.flatMap((one) => wrapped(one, 142))
  const lineHeight = 20
  const heightPx = 34 + lines.length * lineHeight
  const ink = block.isCaution ? theme.caution : theme.ink
  const box = block.isCaution
    ? `<rect x="${marginPx - 14}" y="${px(y)}" width="${widthPx - 2 * marginPx + 28}" height="${px(heightPx)}" rx="4" fill="${theme.cautionFill}" stroke="${theme.caution}" stroke-opacity="0.5"/>`
    : ''
  const title = text(marginPx, y + 22, block.title, 15, ink, 'font-weight="600"')
  const body = lines.map((line, i) => text(marginPx, y + 44 + i * lineHeight, line, 14, ink)).join('')
  return { part: `${box}${title}${body}`, heightPx: heightPx + 14 }
}

/** Breaks text by its number of characters: SVG knows no line breaks of its own. */
function wrapped(words: string, most: number): string[] {
  const lines: string[] = ['']
  for (const word of words.split(/\s+/)) {
    const line = lines[lines.length - 1]!
    if (line !== '' && line.length + 1 + word.length > most) lines.push(word)
    else lines[lines.length - 1] = line === '' ? word : `${line} ${word}`
  }
  return lines
}

function text(x: number, y: number, words: string, sizePx: number, colour: string, more = ''): string {
  return `<text x="${px(x)}" y="${px(y)}" font-size="${sizePx}" fill="${colour}"${more ? ` ${more}` : ''}>${escaped(words)}</text>`
}

function point([x, y]: readonly [number, number]): string {
  return `${px(x)},${px(y)}`
}

/** Tenths of a pixel. */
function px(value: number): string {
  return String(Math.round(value * 10) / 10)
}
