// @ts-check
// Runs inside a replay page, in any browser, without network. Only what touches the page stands here: the picture itself comes from
// shared/pictures, the same core that writes the stills. tests/tools/replay-script.mjs bundles both into
// replay-script.ts, which every page carries.

import {
  atFrame,
  dark,
  drawStage,
  drawStrip,
  light,
  paintCanvas,
  played,
  playing,
  pressed,
  sceneOf,
  speeds,
  startPlayer,
  stripFromPx,
  stripHeightPx,
  timeText,
  turned,
  unpackFrames,
} from '../../../shared/pictures/index.js'

/** @param {string} id @returns {any} */
const byId = (id) => document.getElementById(id)
const stage = byId('stage')
const canvas = byId('canvas')
const strip = byId('strip')
const now = byId('now')
const scrub = byId('scrub')
const clock = byId('clock')
const speedSelect = byId('speed')
const followBox = byId('follow')
const wayBox = byId('way')

const lessMotion = matchMedia('(prefers-reduced-motion: reduce)')
const darkness = matchMedia('(prefers-color-scheme: dark)')

const scene = sceneOf(unpackFrames(JSON.parse(byId('data').textContent)))
const { secondsPerFrame } = scene.frames
let player = startPlayer(scene, lessMotion.matches)

/** Pixels for what is one pixel beside text of 16 pixels: drawings grow with the page's text. */
function unitNow() {
  return Number.parseFloat(getComputedStyle(document.documentElement).fontSize) / 16 || 1
}

/** The canvas at the device's own resolution, cleared; pixels are the page's. */
function cleared(/** @type {any} */ target) {
  const ratio = devicePixelRatio || 1
  const { width, height } = target.getBoundingClientRect()
  const [w, h] = [Math.round(width * ratio), Math.round(height * ratio)]
  if (target.width !== w || target.height !== h) {
    target.width = w
    target.height = h
  }
  const pen = target.getContext('2d')
  pen.setTransform(ratio, 0, 0, ratio, 0, 0)
  pen.clearRect(0, 0, width, height)
  return { pen, rectangle: { leftPx: 0, topPx: 0, widthPx: width, heightPx: height } }
}

const theme = () => (darkness.matches ? dark : light)

function paintStage() {
  const { pen, rectangle } = cleared(canvas)
  // Nothing to paint on while it is not shown, as when the page is printed.
  if (rectangle.widthPx < 1 || rectangle.heightPx < 1) return
  paintCanvas(pen, drawStage(scene, player, rectangle, unitNow()), theme())
}

/** What does not change with time; the cursor over it is moved by moveCursor. */
function paintStrip() {
  const heightPx = stripHeightPx(scene, unitNow())
  strip.style.height = `${heightPx}px`
  if (heightPx === 0) return
  const { pen, rectangle } = cleared(strip)
  if (rectangle.widthPx < 1) return
  paintCanvas(pen, drawStrip(scene, rectangle, unitNow()), theme())
}

function moveCursor() {
  const { width } = strip.getBoundingClientRect()
  const from = stripFromPx({ widthPx: width }, unitNow())
  const share = player.at / Math.max(1, scene.lastFrame)
  now.style.transform = `translateX(${from + (width - 2 * unitNow() - from) * share}px)`
}

const time = (/** @type {number} */ frame) => timeText(frame * secondsPerFrame, secondsPerFrame, 2)

/** Puts the player's state on the page. */
function show() {
  scrub.value = String(Math.floor(player.at))
  scrub.setAttribute('aria-valuetext', time(player.at).replace(' s', ' seconds'))
  clock.textContent = `${time(player.at)} of ${time(scene.lastFrame)}`
  byId('play').textContent = player.isPlaying ? 'Pause' : 'Play'
  speedSelect.value = String(player.speed)
  followBox.checked = player.follows
  wayBox.checked = player.showsWay
  paintStage()
  moveCursor()
}

let then = 0
let isWaiting = false

function change(/** @type {import('../../../shared/pictures/index.js').Player} */ next) {
  const starts = next.isPlaying && !player.isPlaying
  player = next
  show()
  if (starts) then = 0
  keepPlaying()
}

function keepPlaying() {
  if (!player.isPlaying || isWaiting) return
  isWaiting = true
  requestAnimationFrame((nowMs) => {
    isWaiting = false
    if (!player.isPlaying) return
    const before = player
    player = played(player, scene, then > 0 ? (nowMs - then) / 1000 : 0)
    then = nowMs
    if (player.at !== before.at) show()
    keepPlaying()
  })
}

function press(/** @type {string} */ key, hasShift = false) {
  const next = pressed(player, scene, key, hasShift)
  if (next !== undefined) change(next)
  return next !== undefined
}

stage.addEventListener('keydown', (/** @type {KeyboardEvent} */ event) => {
  if (event.ctrlKey || event.altKey || event.metaKey) return
  if (press(event.key, event.shiftKey)) event.preventDefault()
})
// Buttons press the keys that they stand for, so that both can do the same.
for (const button of document.querySelectorAll('button[data-key]'))
  button.addEventListener('click', () => press(/** @type {string} */ (button.getAttribute('data-key'))))
byId('play').addEventListener('click', () => change(playing(player, scene, !player.isPlaying)))
scrub.addEventListener('input', () => change(atFrame(player, scene, Number(scrub.value))))
speedSelect.addEventListener('change', () =>
  change({ ...player, speed: speeds.find((speed) => String(speed) === speedSelect.value) ?? 1 }),
)
followBox.addEventListener('change', () => change({ ...player, follows: followBox.checked }))
wayBox.addEventListener('change', () => change({ ...player, showsWay: wayBox.checked }))

/** Dragging turns the turntable: half the stage's width is a quarter turn. */
let dragged = /** @type {{ x: number, y: number } | undefined} */ (undefined)
if (scene.frames.dimensions === 3) {
  stage.addEventListener('pointerdown', (/** @type {PointerEvent} */ event) => {
    dragged = { x: event.clientX, y: event.clientY }
    stage.setPointerCapture(event.pointerId)
  })
  stage.addEventListener('pointermove', (/** @type {PointerEvent} */ event) => {
    if (dragged === undefined) return
    const perPx = Math.PI / Math.max(1, canvas.getBoundingClientRect().width)
    change(turned(player, (event.clientX - dragged.x) * perPx, (event.clientY - dragged.y) * perPx))
    dragged = { x: event.clientX, y: event.clientY }
  })
  for (const end of ['pointerup', 'pointercancel'])
    stage.addEventListener(end, () => {
      dragged = undefined
    })
}

/** A press or drag on the strip goes to that time. */
function scrubTo(/** @type {PointerEvent} */ event) {
  const { left, width } = strip.getBoundingClientRect()
  const from = stripFromPx({ widthPx: width }, unitNow())
  const share = (event.clientX - left - from) / Math.max(1, width - from)
  if (share >= 0) change(atFrame(player, scene, share * scene.lastFrame))
}
strip.addEventListener('pointerdown', scrubTo)
strip.addEventListener(
  'pointermove',
  (/** @type {PointerEvent} */ event) => event.buttons === 1 && scrubTo(event),
)

function paintAll() {
  paintStrip()
  show()
}
darkness.addEventListener('change', paintAll)
lessMotion.addEventListener('change', () => lessMotion.matches && change(playing(player, scene, false)))
new ResizeObserver(paintAll).observe(canvas)

// #at=3.2 opens a moment, paused: a link to what one wants to show.
const wanted = /^#at=(\d+(\.\d+)?)$/.exec(location.hash)
if (wanted) player = atFrame(player, scene, Number(wanted[1]) / secondsPerFrame)
paintAll()
keepPlaying()
