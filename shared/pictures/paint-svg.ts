// Paints a display list as SVG. Colours are written for the light theme; a style sheet of a few lines gives the dark
// ones where the viewer of the file prefers them (programs that know no style sheets show the light ones).

import type { Discs, Lines, Look, Operation, Words } from './operations.js'
import { dark, fontFamily, type Ink, light, type Theme } from './style.js'

/** Elements for all operations, one a line. */
export function svgElements(operations: readonly Operation[], theme: Theme = light): string {
  return operations
    .map((operation) => painters[operation.shape](operation as never, theme))
    .filter((element) => element !== '')
    .join('\n')
}

const painters: { readonly [shape in Operation['shape']]: (operation: never, theme: Theme) => string } = {
  lines: (operation: Lines, theme) => {
    const path = operation.lines.map((line) => pathOf(line, operation.isClosed === true)).join('')
    return path === '' ? '' : `<path d="${path}"${lookOf(operation, theme)}/>`
  },
  discs: (operation: Discs, theme) => {
    const look = lookOf(operation, theme)
    const circles: string[] = []
    for (let i = 0; i < operation.discs.length; i += 3) {
      const [x, y, r] = [operation.discs[i]!, operation.discs[i + 1]!, operation.discs[i + 2]!]
      circles.push(`<circle cx="${px(x)}" cy="${px(y)}" r="${px(r)}"/>`)
    }
    return circles.length === 0 ? '' : `<g${look}>${circles.join('')}</g>`
  },
  words: (operation: Words, theme) => {
    const { text, x, y, sizePx, ink, anchor } = operation
    const more = [
      anchor === 'start' ? '' : ` text-anchor="${anchor}"`,
      operation.isBold ? ' font-weight="600"' : '',
      operation.hasHalo
        ? ` stroke="${theme.paper}" stroke-width="${px(sizePx / 4)}" stroke-linejoin="round" paint-order="stroke"`
        : '',
    ]
    const inks = operation.hasHalo ? `f-${ink} s-paper` : `f-${ink}`
    return `<text class="${inks}" x="${px(x)}" y="${px(y)}" font-size="${px(sizePx)}" fill="${theme[ink]}"${more.join('')}>${escaped(text)}</text>`
  },
}

function pathOf(line: readonly number[], isClosed: boolean): string {
  let path = ''
  for (let i = 0; i + 1 < line.length; i += 2) {
    path += `${i === 0 ? 'M' : i === 2 ? 'L' : ' '}${px(line[i]!)},${px(line[i + 1]!)}`
  }
  return isClosed && path !== '' ? `${path}Z` : path
}

function lookOf(look: Look, theme: Theme): string {
  const { fill, stroke, dashPx } = look
  const inks = [fill ? `f-${fill}` : '', stroke ? `s-${stroke}` : ''].filter((name) => name !== '')
  const parts = [` class="${inks.join(' ')}" fill="${fill ? theme[fill] : 'none'}"`]
  if (look.fillOpacity !== undefined) parts.push(` fill-opacity="${px(look.fillOpacity)}"`)
  if (stroke) parts.push(` stroke="${theme[stroke]}" stroke-width="${px(look.widthPx ?? 1)}"`)
  if (stroke && look.strokeOpacity !== undefined) parts.push(` stroke-opacity="${px(look.strokeOpacity)}"`)
  if (stroke && dashPx) parts.push(` stroke-dasharray="${dashPx.map(px).join(' ')}"`)
  if (look.isRound) parts.push(' stroke-linecap="round" stroke-linejoin="round"')
  return parts.join('')
}

/** Style sheet for a document or a page that shows such elements. */
export function darkStyle(theme: Theme = dark): string {
  const rules = (Object.keys(theme) as Ink[]).map(
    (ink) => `.f-${ink}{fill:${theme[ink]}}.s-${ink}{stroke:${theme[ink]}}`,
  )
  return `@media screen and (prefers-color-scheme:dark){${rules.join('')}}`
}

export interface SvgDocument {
  readonly title: string
  /** The picture in words, for people who do not see it. */
  readonly description: string
  readonly widthPx: number
  readonly heightPx: number
  readonly operations: readonly Operation[]
}

/** A file of its own: no script, no font file, no network. */
export function svgDocument({ title, description, widthPx, heightPx, operations }: SvgDocument): string {
  return `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 ${px(widthPx)} ${px(heightPx)}" width="${px(widthPx)}" height="${px(heightPx)}" style="max-width:100%;height:auto" role="img" aria-labelledby="title description" font-family="${escaped(fontFamily)}">
<title id="title">${escaped(title)}</title>
<desc id="description">${escaped(description)}</desc>
<style>${darkStyle()}</style>
<rect class="f-paper" width="${px(widthPx)}" height="${px(heightPx)}" fill="${light.paper}"/>
${svgElements(operations)}
</svg>
`
}

/** Hundredths of a pixel below 10, tenths above: far below what can be seen. */
function px(value: number): string {
  const parts = Math.abs(value) < 10 ? 100 : 10
  return String(Math.round(value * parts) / parts)
}

/** Text safe inside XML and HTML, attribute values too; characters that XML 1.0 forbids are dropped. */
export function escaped(text: string): string {
  return text
    .replace(/[^\t\n\r\x20-\ud7ff\ue000-\ufffd]/g, '')
    .replace(/[&<>"']/g, (character) => `&#${character.charCodeAt(0)};`)
}
