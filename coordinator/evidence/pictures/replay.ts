// The run of a machine as one HTML file that plays by itself in any browser: no network (its own policy forbids it), no font, no
// library. The numbers travel as 16-bit steps between the smallest and the largest value, base64: a step is 1/65,535 of
// the extent, far below a pixel. Replay-client.js draws them; a table says the same in text.

import { readFileSync } from 'node:fs'
import { check } from '../../../shared/check.js'
import type { Frames } from '../../../shared/problem.js'
import {
  alwaysCaution,
  cautionText,
  escaped,
  type PictureFacts,
  resultSentence,
  significant,
  titleOf,
} from './facts.js'
import {
  extentOf,
  framesFault,
  kindsOf,
  momentsOf,
  nodeAt,
  nodeCount,
  roundStep,
  secondsAt,
} from './geometry.js'
import { colourOf, dark, fontFamily, type LinkStyle, light, linkStyles, type Theme } from './style.js'

const momentsInTable = 9

/** The page as HTML text. The frames must be sound (framesFault). */
export function replayHtml(frames: Frames, facts: PictureFacts): string {
  check(framesFault(frames) === undefined, 'frames were checked before they are drawn')
  const styles = linkStyles(kindsOf(frames))
  const lanes = styles.filter(({ isActive }) => isActive).length
  return `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; script-src 'unsafe-inline'; style-src 'unsafe-inline'">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="color-scheme" content="light dark">
<title>${escaped(titleOf(facts))}</title>
<style>
${variables(lanes)}
${asset('replay-page.css')}
</style>
</head>
<body>
<main>
<h1>${escaped(titleOf(facts))}</h1>
<p>${escaped(resultSentence(facts))}</p>
<p class="faint">Shown: ${escaped(facts.shown)}.</p>
${player(frames, styles)}
<section class="caution"><h2>Cautions</h2>${paragraphs([...facts.cautions.map(cautionText), alwaysCaution])}</section>
${section('Machine', facts.description)}
${table(frames, facts)}
${section('Origin', facts.provenance)}
</main>
<script type="application/json" id="data">${dataJson(frames, styles)}</script>
<script type="module">
${asset('replay-client.js')}
</script>
</body>
</html>
`
}

const assets = new Map<string, string>()

/** A file beside this one. */
function asset(name: string): string {
  const text = assets.get(name) ?? readFileSync(new URL(`./${name}`, import.meta.url), 'utf8')
  assets.set(name, text)
  return text
}

function variables(lanes: number): string {
  const of = (theme: Theme) =>
    `--paper: ${theme.paper}; --ink: ${theme.ink}; --faint: ${theme.faint}; --ground-fill: ${theme.groundFill}; --caution: ${theme.caution}; --caution-fill: ${theme.cautionFill}; --focus: ${theme.active[0]};`
  return `:root { --font: ${fontFamily}; --lanes: ${Math.max(1, lanes)}; ${of(light)} }
@media (prefers-color-scheme: dark) { :root { ${of(dark)} } }
@media print { #strip, .row { display: none } }`
}

function player(frames: Frames, styles: readonly LinkStyle[]): string {
  const last = frames.positions.length - 1
  const strip = styles.some(({ isActive }) => isActive)
    ? '<canvas id="strip" role="img" aria-label="Drive of each actuator group over time; up is longer"></canvas>'
    : '<canvas id="strip" hidden></canvas>'
  const speeds = [0.1, 0.25, 0.5, 1, 2, 4]
    .map(
      (speed) =>
        `<option value="${speed}"${speed === 1 ? ' selected' : ''}>${speed} times real time</option>`,
    )
    .join('')
  return `<canvas id="stage" tabindex="0" role="img" aria-label="The machine moving over the ground. A table of its motion follows below." aria-describedby="keys"></canvas>
<div class="row"><button id="play" type="button">Play</button>
<input id="scrub" type="range" min="0" max="${last}" step="1" value="0" aria-label="Time">
<span id="clock"></span></div>
<div class="row"><label>Speed <select id="speed">${speeds}</select></label>
<label><input id="follow" type="checkbox" checked> Follow the machine</label>
<label><input id="trace" type="checkbox" checked> Show the path</label></div>
${strip}
${legend(frames, styles)}
<p class="faint" id="keys">Keys, with the drawing in focus: space plays and pauses, left and right step by one frame, with shift by ten, home and end go to the ends.</p>
<noscript><p>The drawing needs JavaScript; the table below does not.</p></noscript>`
}

function legend(frames: Frames, styles: readonly LinkStyle[]): string {
  const line = (style: LinkStyle, theme: Theme) =>
    `<path d="M1 8h36" stroke="${colourOf(theme, style)}" stroke-width="${style.width}"${style.dash.length > 0 ? ` stroke-dasharray="${style.dash.map((part) => part * style.width).join(' ')}"` : ''}/>`
  const items = styles.map((style) => sample((theme) => line(style, theme), style.kind))
  const markers = frames.markers.map(({ label }) =>
    sample(
      (theme) =>
        `<circle cx="19" cy="8" r="6" fill="${theme.marker}" fill-opacity="0.35" stroke="${theme.marker}" stroke-width="2"/>`,
      label,
    ),
  )
  return `<ul class="legend">${[...items, ...markers].join('')}</ul>`
}

/** A drawn example in both themes; the page shows the one that fits. */
function sample(draw: (theme: Theme) => string, label: string): string {
  const picture = (theme: Theme, media: string) => `<g class="${media}">${draw(theme)}</g>`
  return `<li><svg width="38" height="16" aria-hidden="true"><style>.on-dark{display:none}@media (prefers-color-scheme: dark){.on-dark{display:inline}.on-light{display:none}}</style>${picture(light, 'on-light')}${picture(dark, 'on-dark')}</svg>${escaped(label)}</li>`
}

function paragraphs(lines: readonly string[]): string {
  return lines.map((line) => `<p>${escaped(line)}</p>`).join('')
}

function section(title: string, lines: readonly string[]): string {
  return lines.length === 0 ? '' : `<section><h2>${title}</h2>${paragraphs(lines)}</section>`
}

/** The motion in numbers: where the machine's middle and each marker are. */
function table(frames: Frames, facts: PictureFacts): string {
  const nodes = nodeCount(frames)
  const markers = frames.markers.slice(0, 4)
  const head = [
    'time, s',
    'middle of the machine, m',
    ...markers.flatMap(({ label }) => [`${label} along, m`, `${label} height, m`]),
  ]
  const rows = momentsOf(frames, momentsInTable).map((frame) => {
    let sum = 0
    for (let node = 0; node < nodes; node++) sum += nodeAt(frames, frame, node)[0]
    const places = markers.flatMap(({ node }) => nodeAt(frames, frame, node).map((value) => value.toFixed(3)))
    return [secondsAt(frames, frame).toFixed(2), (sum / nodes).toFixed(3), ...places]
  })
  const cells = (tag: string, row: readonly string[]) =>
    `<tr>${row.map((cell) => `<${tag}>${escaped(cell)}</${tag}>`).join('')}</tr>`
  const travel = nodeTravel(frames)
  return `<details><summary>The motion as a table</summary>
<p>In ${significant(secondsAt(frames, frames.positions.length - 1))} s the middle of ${escaped(facts.id)} moves ${significant(travel)} m along the ground.</p>
<div class="scroll" tabindex="0" role="region" aria-label="Motion"><table><thead>${cells('th scope="col"', head).replace(/<\/th scope="col">/g, '</th>')}</thead><tbody>${rows.map((row) => cells('td', row)).join('')}</tbody></table></div></details>`
}

function nodeTravel(frames: Frames): number {
  const middle = (frame: number) => {
    let sum = 0
    for (let node = 0; node < nodeCount(frames); node++) sum += nodeAt(frames, frame, node)[0]
    return sum / nodeCount(frames)
  }
  return middle(frames.positions.length - 1) - middle(0)
}

interface Packed {
  readonly base64: string
  readonly low: number
  readonly step: number
}

/** Numbers as little-endian 16-bit steps between their smallest and largest. */
export function packed(values: readonly number[]): Packed {
  const low = values.reduce((a, b) => Math.min(a, b), Infinity)
  const high = values.reduce((a, b) => Math.max(a, b), -Infinity)
  const step = high > low ? (high - low) / 65_535 : 1
  const bytes = Buffer.alloc(2 * values.length)
  for (const [i, value] of values.entries()) bytes.writeUInt16LE(Math.round((value - low) / step), 2 * i)
  return { base64: bytes.toString('base64'), low: Number.isFinite(low) ? low : 0, step }
}

function dataJson(frames: Frames, styles: readonly LinkStyle[]): string {
  const nodes = nodeCount(frames)
  const all = frames.positions.map((_, frame) => frame)
  const places = all.flatMap((frame) =>
    Array.from({ length: nodes }, (_, node) => nodeAt(frames, frame, node)),
  )
  const kinds = styles.map(({ kind }) => kind)
  const extent = extentOf(frames, all)
  const first = extentOf(frames, [0])
  const wide = extent.right - extent.left
  const data = {
    frames: frames.positions.length,
    nodes,
    secondsPerFrame: frames.secondsPerFrame,
    x: packed(places.map(([x]) => x)),
    y: packed(places.map(([, y]) => y)),
    links: frames.links.map(({ a, b, kind }) => [a, b, kinds.indexOf(kind)]),
    radii: frames.nodeRadiiM,
    ground: frames.ground,
    markers: frames.markers.map(({ node, radiusM }) => ({ node, radiusM })),
    drives: drivesOf(frames, kinds),
    styles,
    extent: {
      ...extent,
      bottom: Math.min(extent.bottom, lowestGround(frames, extent.left, extent.right)),
      bodyWidth: first.right - first.left,
    },
    tick: roundStep(Math.max(wide, 1e-6) / 8),
    bar: roundStep(Math.max(first.right - first.left, 1e-6) / 2),
    light,
    dark,
  }
  // Inside a script element only "<" could end it.
  return JSON.stringify(data).replace(/</g, '\\u003c')
}

function lowestGround(frames: Frames, left: number, right: number): number {
  const below = frames.ground.filter(([x]) => x >= left && x <= right).map(([, y]) => y)
  return below.reduce((a, b) => Math.min(a, b), Infinity)
}

/** One lane a kind: links of one kind are driven alike; where they are not, their mean is shown. */
function drivesOf(frames: Frames, kinds: readonly string[]): { kind: number; values: Packed }[] {
  return kinds.flatMap((kind, place) => {
    const own = frames.drive.filter(({ link }) => frames.links[link]!.kind === kind)
    if (own.length === 0) return []
    const mean = frames.positions.map(
      (_, frame) => own.reduce((sum, { values }) => sum + values[frame]!, 0) / own.length,
    )
    return [{ kind: place, values: packed(mean) }]
  })
}
