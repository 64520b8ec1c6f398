// The run of a machine as one HTML file that plays by itself in any browser: no network (its own policy forbids it), no
// font, no library. The numbers travel packed (shared/pictures/packing.ts); the script is replay-client.js bundled with
// the drawing core. Without script the page still shows moments of the run and a table of the motion; both are printed.

import { readFileSync } from 'node:fs'
import { check } from '../../../shared/check.js'
import type { Frames } from '../../../shared/frames.js'
import {
  dark,
  darkStyle,
  drawMoments,
  escaped,
  fontFamily,
  framesFault,
  type Ink,
  keysFor,
  legendRows,
  light,
  momentsOf,
  packFrames,
  type Scene,
  sampleHeightPx,
  sampleWidthPx,
  sceneOf,
  secondsAt,
  speeds,
  svgElements,
  type Theme,
  timeText,
} from '../../../shared/pictures/index.js'
import {
  alwaysCaution,
  cautionText,
  type PictureFacts,
  resultSentence,
  significant,
  titleOf,
} from './facts.js'
import { replayScript } from './replay-script.js'

const momentsInTable = 9

/** The page as HTML text. The frames must be sound (framesFault). */
export function replayHtml(frames: Frames, facts: PictureFacts): string {
  check(framesFault(frames) === undefined, 'frames were checked before they are drawn')
  const scene = sceneOf(frames)
  return `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; script-src 'unsafe-inline'; style-src 'unsafe-inline'">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="color-scheme" content="light dark">
<title>${escaped(titleOf(facts))}</title>
<style>
${variables()}
${darkStyle()}
${asset('replay-page.css')}
</style>
</head>
<body>
<main>
<h1>${escaped(titleOf(facts))}</h1>
<p>${escaped(resultSentence(facts))}</p>
<p class="faint">Shown: ${escaped(facts.shown)}.</p>
${player(scene)}
${legend(scene)}
${keyTable(scene)}
<section class="caution"><h2>Cautions</h2>${paragraphs([...facts.cautions.map(cautionText), alwaysCaution])}</section>
${section('Machine', facts.description)}
${moments(scene, facts)}
${table(scene, facts)}
${section('Origin', facts.provenance)}
</main>
<script type="application/json" id="data">${dataJson(frames)}</script>
<script>
${replayScript}
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

function variables(): string {
  const of = (theme: Theme) =>
    (Object.keys(theme) as Ink[]).map((ink) => `--${ink}: ${theme[ink]};`).join(' ')
  return `:root { --font: ${fontFamily}; ${of(light)} }
@media screen and (prefers-color-scheme: dark) { :root { ${of(dark)} } }`
}

function player(scene: Scene): string {
  const isSolid = scene.frames.dimensions === 3
  const options = speeds
    .map(
      (speed) =>
        `<option value="${speed}"${speed === 1 ? ' selected' : ''}>${speed} times real time</option>`,
    )
    .join('')
  const turntable = `<div class="row" role="group" aria-label="Turntable">${turnButtons
    .map(([key, shown, label]) => button(key, shown, label))
    .join('')}</div>`
  return `<div id="stage" class="${[isSolid ? 'solid' : '', isTall(scene) ? 'tall' : ''].join(' ').trim()}" tabindex="0" role="application" aria-label="The machine in motion. Moments of it and a table follow below." aria-describedby="keys"><canvas id="canvas" aria-hidden="true"></canvas></div>
<div class="controls">
<div class="row"><button id="play" type="button">Play</button>${button('ArrowLeft', '−1', 'One frame back')}${button('ArrowRight', '+1', 'One frame forward')}
<input id="scrub" type="range" min="0" max="${scene.lastFrame}" step="1" value="0" aria-label="Time">
<span id="clock"></span></div>
<div class="row"><label>Speed <select id="speed">${options}</select></label>
<label><input id="follow" type="checkbox" checked> Follow the machine</label>
<label${scene.frames.markers.length === 0 ? ' hidden' : ''}><input id="way" type="checkbox" checked> Show its path</label></div>
${isSolid ? turntable : ''}
<div class="over"><canvas id="strip" role="img" aria-label="Drives and contact over time; up is longer. Press or drag to go to a time."></canvas><div id="now" aria-hidden="true"></div></div>
</div>
<noscript><p>Playing needs JavaScript; the moments and the table below do not.</p></noscript>`
}

/** Higher than the ordinary stage has room for. */
function isTall({ wayBox: { low, high } }: Scene): boolean {
  return high[1] - low[1] > 0.45 * Math.max(high[0] - low[0], high[2] - low[2])
}

/** Key, what the button shows, what it does. */
const turnButtons = [
  ['a', '↶', 'Turn left'],
  ['d', '↷', 'Turn right'],
  ['w', '⤒', 'More from above'],
  ['s', '⤓', 'More from the side'],
  ['1', 'side', 'From the side'],
  ['2', 'front', 'From the front'],
  ['3', 'top', 'From above'],
  ['4', 'corner', 'From the corner'],
] as const

function button(key: string, shown: string, label: string): string {
  return `<button type="button" data-key="${escaped(key)}" aria-label="${label}" title="${label}">${shown}</button>`
}

function legend(scene: Scene): string {
  const items = legendRows(scene).map(
    ({ sample, words }) =>
      `<li><svg width="${sampleWidthPx}" height="${sampleHeightPx}" viewBox="0 0 ${sampleWidthPx} ${sampleHeightPx}" aria-hidden="true">${svgElements(sample)}</svg>${escaped(words)}</li>`,
  )
  return `<ul class="legend" aria-label="Legend">${items.join('')}</ul>`
}

function keyTable(scene: Scene): string {
  const rows = keysFor(scene).map(
    ({ shown, says }) => `<div><dt><kbd>${escaped(shown)}</kbd></dt><dd>${escaped(says)}</dd></div>`,
  )
  const drag = scene.frames.dimensions === 3 ? ' Dragging over the drawing turns it.' : ''
  return `<section class="keys" id="keys"><h2>Keys, with the drawing in focus</h2><dl>${rows.join('')}</dl><p class="faint">Pressing or dragging on the curves goes to that time.${drag}</p></section>`
}

function paragraphs(lines: readonly string[]): string {
  return lines.map((line) => `<p>${escaped(line)}</p>`).join('')
}

function section(title: string, lines: readonly string[]): string {
  return lines.length === 0 ? '' : `<section><h2>${title}</h2>${paragraphs(lines)}</section>`
}

const stillsWidthPx = 1000

/** The same stills as in the picture: for print, for people without script, and at a glance. */
function moments(scene: Scene, facts: PictureFacts): string {
  const { operations, heightPx } = drawMoments(scene, {
    leftPx: 4,
    topPx: 0,
    widthPx: stillsWidthPx - 8,
    unit: 1.1,
  })
  const high = Math.ceil(heightPx + 6)
  return `<section><h2>Moments</h2><div class="scroll" tabindex="0" role="region" aria-label="Moments of the run"><svg class="stills" viewBox="0 0 ${stillsWidthPx} ${high}" width="${stillsWidthPx}" height="${high}" role="img" aria-label="Moments of the run of ${escaped(facts.id)}">${svgElements(operations)}</svg></div></section>`
}

/** The motion in numbers: where the machine's middle and each marker are. */
function table(scene: Scene, facts: PictureFacts): string {
  const { frames, middlesM } = scene
  const markers = frames.markers.slice(0, 4)
  const head = [
    'time, s',
    'middle of the machine, m',
    ...markers.flatMap(({ label }) => [`${label} along, m`, `${label} height, m`]),
  ]
  const rows = momentsOf(frames, momentsInTable).map((frame) => {
    const places = markers.flatMap(({ node }) => {
      const at = node * frames.dimensions
      return [frames.positions[frame]![at]!, frames.positions[frame]![at + 1]!].map((value) =>
        value.toFixed(3),
      )
    })
    return [
      timeText(secondsAt(frames, frame), frames.secondsPerFrame, 2).replace(' s', ''),
      middle(scene, frame).toFixed(3),
      ...places,
    ]
  })
  const headCells = head.map((cell) => `<th scope="col">${escaped(cell)}</th>`).join('')
  const bodyRows = rows
    .map((row) => `<tr>${row.map((cell) => `<td>${escaped(cell)}</td>`).join('')}</tr>`)
    .join('')
  const travel = middle(scene, scene.lastFrame) - middle(scene, 0)
  const seconds = significant(secondsAt(frames, middlesM.length / 3 - 1))
  return `<details><summary>The motion as a table</summary>
<p>In ${seconds} s the middle of ${escaped(facts.id)} moves ${significant(travel)} m along the ground.</p>
<div class="scroll" tabindex="0" role="region" aria-label="Motion"><table><thead><tr>${headCells}</tr></thead><tbody>${bodyRows}</tbody></table></div></details>`
}

/** Mean place of all nodes along the ground; of the machine's bodies where there are no nodes. */
function middle({ frames, nodeCount, middlesM }: Scene, frame: number): number {
  if (nodeCount === 0) return middlesM[3 * frame]!
  const positions = frames.positions[frame]!
  let sum = 0
  for (let node = 0; node < nodeCount; node++) sum += positions[node * frames.dimensions]!
  return sum / nodeCount
}

function dataJson(frames: Frames): string {
  // Inside a script element only "<" could end it.
  return JSON.stringify(packFrames(frames)).replace(/</g, '\\u003c')
}
