// The best machine as one SVG file: moments of its run on a common scale, legend, result with its uncertainty, cautions
// in full. What is drawn comes from shared/pictures; here it is put on one sheet with the facts.

import { check } from '../../../shared/check.js'
import type { Frames } from '../../../shared/frames.js'
import {
  drawLegend,
  drawMoments,
  framesFault,
  type Ink,
  legendRows,
  momentTimes,
  type Operation,
  sceneOf,
  svgDocument,
  textWidthPx,
} from '../../../shared/pictures/index.js'
import { alwaysCaution, cautionText, type PictureFacts, resultSentence, titleOf } from './facts.js'

const widthPx = 1200
const marginPx = 44
const roomPx = widthPx - 2 * marginPx
const unit = 1.2

/** The picture as SVG text. The frames must be sound (framesFault). */
export function bestSvg(frames: Frames, facts: PictureFacts): string {
  check(framesFault(frames) === undefined, 'frames were checked before they are drawn')
  const scene = sceneOf(frames)
  const operations: Operation[] = []
  let y = marginPx
  const add = (part: { readonly operations: readonly Operation[]; readonly heightPx: number }) => {
    operations.push(...part.operations)
    y += part.heightPx
  }
  add(textLines([titleOf(facts)], y, 26, true))
  add(textLines(wrapped(resultSentence(facts), 16), y, 16))
  add(textLines(wrapped(`Shown: ${facts.shown}.`, 16), y, 16))
  y += 10
  const place = { leftPx: marginPx, widthPx: roomPx, unit }
  add(drawLegend(legendRows(scene), { ...place, topPx: y }))
  y += 6
  const moments = drawMoments(scene, { ...place, topPx: y })
  add(moments)
  y += 20
  for (const block of foot(facts)) add(paragraph(block, y))
  const times = momentTimes(frames, moments.shown).join(', ')
  return svgDocument({
    title: titleOf(facts),
    description: `${titleOf(facts)}: ${resultSentence(facts)} Shown: ${facts.shown}, at ${times}.`,
    widthPx,
    heightPx: Math.ceil(y + marginPx / 2),
    operations,
  })
}

interface Block {
  readonly title: string
  readonly paragraphs: readonly string[]
  readonly isCaution: boolean
}

function foot(facts: PictureFacts): Block[] {
  const blocks: Block[] = [
    { title: 'Cautions', paragraphs: [...facts.cautions.map(cautionText), alwaysCaution], isCaution: true },
    { title: 'Machine', paragraphs: facts.description, isCaution: false },
    { title: 'Origin', paragraphs: facts.provenance, isCaution: false },
  ]
  return blocks.filter(({ paragraphs }) => paragraphs.length > 0)
}

/** Lines of text below each other. */
function textLines(lines: readonly string[], top: number, sizePx: number, isBold = false, ink: Ink = 'ink') {
  const linePx = 1.42 * sizePx
  const operations = lines.map(
    (text, i): Operation => ({
      shape: 'words',
      role: 'text',
      text,
      x: marginPx,
      y: top + sizePx + i * linePx,
      sizePx,
      ink,
      anchor: 'start',
      isBold,
    }),
  )
  return { operations, heightPx: lines.length * linePx + 0.2 * sizePx }
}

function paragraph(block: Block, top: number) {
  const ink = block.isCaution ? 'caution' : 'ink'
  const title = textLines([block.title], top + 6, 15, true, ink)
  const lines = block.paragraphs.flatMap((one) => wrapped(one, 14))
  const body = textLines(lines, top + 6 + title.heightPx, 14, false, ink)
  const heightPx = title.heightPx + body.heightPx + 16
  const [left, right, bottom] = [marginPx - 14, widthPx - marginPx + 14, top + heightPx]
  const frame: Operation = {
    shape: 'lines',
    role: 'text',
    lines: [[left, top, right, top, right, bottom, left, bottom]],
    isClosed: true,
    fill: 'cautionFill',
    stroke: 'caution',
    strokeOpacity: 0.5,
  }
  return {
    operations: [...(block.isCaution ? [frame] : []), ...title.operations, ...body.operations],
    heightPx: heightPx + 12,
  }
}

/** Breaks text by its number of letters: SVG knows no line breaks of its own. */
function wrapped(words: string, sizePx: number): string[] {
  const lines: string[] = ['']
  for (const word of words.split(/\s+/)) {
    const line = lines[lines.length - 1]!
    if (line !== '' && textWidthPx(`${line} ${word}`, sizePx) > roomPx) lines.push(word)
    else lines[lines.length - 1] = line === '' ? word : `${line} ${word}`
  }
  return lines
}
