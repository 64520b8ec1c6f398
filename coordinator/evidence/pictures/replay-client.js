// Runs inside a replay page, in any browser, without network. Reads the numbers from the page, draws one frame at a time on a canvas.
// The clock only moves the frame; every frame is a pure function of its number, so scrubbing and playing show the same.

const data = JSON.parse(document.getElementById('data').textContent)
const byId = (id) => document.getElementById(id)
const stage = byId('stage')
const strip = byId('strip')
const scrub = byId('scrub')
const playButton = byId('play')
const speedSelect = byId('speed')
const followBox = byId('follow')
const traceBox = byId('trace')
const clock = byId('clock')
const reduced = matchMedia('(prefers-reduced-motion: reduce)')
const darkness = matchMedia('(prefers-color-scheme: dark)')

function bytesOf(base64) {
  const text = atob(base64)
  const bytes = new Uint8Array(text.length)
  for (let i = 0; i < text.length; i++) bytes[i] = text.charCodeAt(i)
  return new DataView(bytes.buffer)
}
/** Little-endian 16-bit steps back to numbers. */
function unpack({ base64, low, step }) {
  const view = bytesOf(base64)
  return Float64Array.from(
    { length: view.byteLength / 2 },
    (_, i) => low + step * view.getUint16(2 * i, true),
  )
}

const xs = unpack(data.x)
const ys = unpack(data.y)
const drives = data.drives.map(({ values, kind }) => ({ kind, values: unpack(values) }))
const { nodes, frames, secondsPerFrame } = data
const last = frames - 1

const centreX = new Float64Array(frames)
for (let f = 0; f < frames; f++) {
  let sum = 0
  for (let n = 0; n < nodes; n++) sum += xs[f * nodes + n]
  centreX[f] = sum / nodes
}
/** The camera's place: centres averaged over a second, so that a gait does not shake the view. */
const half = Math.max(1, Math.round(0.5 / secondsPerFrame))
const cameraX = centreX.map((_, f) => {
  let sum = 0
  let count = 0
  for (let g = Math.max(0, f - half); g <= Math.min(last, f + half); g++) {
    sum += centreX[g]
    count++
  }
  return sum / count
})

let frame = 0
let playing = !reduced.matches && last > 0
let then = 0
let carry = 0

/** Pixels of a size that is meant for ordinary text of 16 pixels: drawings grow with the page's text. */
let unit = 1
function px(size) {
  return size * unit
}

function colours() {
  return darkness.matches ? data.dark : data.light
}

function fitted(canvas) {
  const ratio = devicePixelRatio || 1
  unit = Number.parseFloat(getComputedStyle(document.documentElement).fontSize) / 16 || 1
  const { width, height } = canvas.getBoundingClientRect()
  const [w, h] = [Math.round(width * ratio), Math.round(height * ratio)]
  if (canvas.width !== w || canvas.height !== h) {
    canvas.width = w
    canvas.height = h
  }
  const pen = canvas.getContext('2d')
  pen.setTransform(ratio, 0, 0, ratio, 0, 0)
  pen.clearRect(0, 0, width, height)
  return { pen, width, height }
}

/** Metres to pixels for a frame: the body fills a good part of the view, or the whole way fits in. */
function viewOf(width, height) {
  const { left, right, bottom, top, bodyWidth } = data.extent
  const wide = followBox.checked ? Math.min(right - left, bodyWidth * 2.2) : right - left
  const high = (top - bottom) * 1.12
  const scale = Math.min(width / (wide * 1.06), height / high)
  const middle = followBox.checked ? cameraX[frame] : (left + right) / 2
  const baseline = height / 2 + ((top + bottom) / 2) * scale
  return { scale, x: (m) => width / 2 + (m - middle) * scale, y: (m) => baseline - m * scale, middle }
}

function drawStage() {
  const { pen, width, height } = fitted(stage)
  const theme = colours()
  const view = viewOf(width, height)
  drawGround(pen, view, theme, width, height)
  if (traceBox.checked) drawTrace(pen, view, theme)
  drawMarkers(pen, view, theme)
  drawLinks(pen, view, theme)
  drawNodes(pen, view, theme)
  drawScaleBar(pen, view, theme, width, height)
}

function drawGround(pen, view, theme, width, height) {
  const points = data.ground
  if (points.length < 2) return
  pen.beginPath()
  for (const [i, [x, y]] of points.entries()) pen[i === 0 ? 'moveTo' : 'lineTo'](view.x(x), view.y(y))
  pen.lineWidth = px(2)
  pen.strokeStyle = theme.ground
  pen.stroke()
  pen.lineTo(view.x(points[points.length - 1][0]), height)
  pen.lineTo(view.x(points[0][0]), height)
  pen.closePath()
  pen.fillStyle = theme.groundFill
  pen.fill()
  // Marks on the ground, so that motion shows while the view follows.
  const step = data.tick
  const from = Math.ceil((view.middle - width / view.scale) / step)
  const to = Math.floor((view.middle + width / view.scale) / step)
  pen.fillStyle = theme.faint
  pen.font = `${px(12)}px sans-serif`
  pen.textAlign = 'center'
  const every = Math.max(1, Math.ceil(px(64) / (step * view.scale)))
  for (let k = from; k <= to; k++) {
    if (k % every !== 0) continue
    const x = view.x(k * step)
    if (x < px(28) || x > width - px(28)) continue
    pen.fillRect(x, height - px(22), 1, px(6))
    pen.fillText(`${Number((k * step).toFixed(4))} m`, x, height - px(5))
  }
}

function drawTrace(pen, view, theme) {
  pen.lineWidth = px(1.5)
  pen.strokeStyle = theme.path
  for (const { node } of data.markers) {
    pen.beginPath()
    for (let f = 0; f <= frame; f++)
      pen[f === 0 ? 'moveTo' : 'lineTo'](view.x(xs[f * nodes + node]), view.y(ys[f * nodes + node]))
    pen.stroke()
  }
}

function drawMarkers(pen, view, theme) {
  for (const { node, radiusM } of data.markers) {
    pen.beginPath()
    pen.arc(
      view.x(xs[frame * nodes + node]),
      view.y(ys[frame * nodes + node]),
      Math.max(px(5), radiusM * view.scale),
      0,
      7,
    )
    pen.globalAlpha = 0.35
    pen.fillStyle = theme.marker
    pen.fill()
    pen.globalAlpha = 1
    pen.lineWidth = px(2)
    pen.strokeStyle = theme.marker
    pen.stroke()
  }
}

function drawLinks(pen, view, theme) {
  pen.lineCap = 'round'
  for (const [place, style] of data.styles.entries()) {
    const drive = drives.find(({ kind }) => kind === place)
    // A driven link is thicker while it is long: the drive shows without colour.
    const width = style.width + (drive ? 2.5 * drive.values[frame] : 0)
    pen.lineWidth = px(Math.max(1.2, width))
    pen.strokeStyle = (style.isActive ? theme.active : theme.passive)[style.colour]
    pen.setLineDash(style.dash.map((part) => px(part * style.width)))
    pen.beginPath()
    for (const [a, b, kind] of data.links) {
      if (kind !== place) continue
      pen.moveTo(view.x(xs[frame * nodes + a]), view.y(ys[frame * nodes + a]))
      pen.lineTo(view.x(xs[frame * nodes + b]), view.y(ys[frame * nodes + b]))
    }
    pen.stroke()
  }
  pen.setLineDash([])
}

function drawNodes(pen, view, theme) {
  pen.lineWidth = px(1.2)
  pen.strokeStyle = theme.ink
  pen.fillStyle = theme.paper
  for (let n = 0; n < nodes; n++) {
    pen.beginPath()
    pen.arc(
      view.x(xs[frame * nodes + n]),
      view.y(ys[frame * nodes + n]),
      Math.min(px(12), Math.max(px(2), data.radii[n] * view.scale)),
      0,
      7,
    )
    pen.fill()
    pen.stroke()
  }
}

function drawScaleBar(pen, view, theme, width) {
  let metres = data.bar
  while (metres * view.scale > width / 3) metres /= 2
  const long = metres * view.scale
  const edge = width - px(14)
  pen.strokeStyle = theme.ink
  pen.lineWidth = px(2)
  pen.beginPath()
  pen.moveTo(edge - long, px(14))
  pen.lineTo(edge - long, px(22))
  pen.lineTo(edge, px(22))
  pen.lineTo(edge, px(14))
  pen.stroke()
  pen.fillStyle = theme.ink
  pen.font = `${px(13)}px sans-serif`
  pen.textAlign = 'right'
  pen.fillText(
    metres < 0.1 ? `${Number((metres * 1000).toFixed(1))} mm` : `${metres} m`,
    edge - long - px(8),
    px(23),
  )
}

/** One lane a driven kind: its drive over the whole run, and where we are. */
function drawStrip() {
  if (drives.length === 0) return
  const { pen, width, height } = fitted(strip)
  const theme = colours()
  const lane = height / drives.length
  const from = Math.min(px(110), width * 0.28)
  pen.font = `${px(13)}px sans-serif`
  pen.textBaseline = 'middle'
  for (const [i, { kind, values }] of drives.entries()) {
    const style = data.styles[kind]
    const middle = (i + 0.5) * lane
    pen.fillStyle = theme.ink
    pen.textAlign = 'left'
    pen.fillText(style.kind, 0, middle, from - px(8))
    pen.strokeStyle = theme.faint
    pen.lineWidth = 0.5
    pen.beginPath()
    pen.moveTo(from, middle)
    pen.lineTo(width, middle)
    pen.stroke()
    pen.strokeStyle = theme.active[style.colour] ?? theme.ink
    pen.lineWidth = px(1.8)
    pen.beginPath()
    for (let f = 0; f < frames; f++) {
      const x = from + ((width - from - 2) * f) / Math.max(1, last)
      pen[f === 0 ? 'moveTo' : 'lineTo'](x, middle - values[f] * lane * 0.4)
    }
    pen.stroke()
  }
  const now = from + ((width - from - 2) * frame) / Math.max(1, last)
  pen.strokeStyle = theme.ink
  pen.lineWidth = px(1.5)
  pen.beginPath()
  pen.moveTo(now, 0)
  pen.lineTo(now, height)
  pen.stroke()
  pen.textBaseline = 'alphabetic'
}

function show() {
  scrub.value = String(frame)
  const seconds = (frame * secondsPerFrame).toFixed(2)
  clock.textContent = `${seconds} s of ${(last * secondsPerFrame).toFixed(2)} s`
  scrub.setAttribute('aria-valuetext', `${seconds} seconds`)
  drawStage()
  drawStrip()
}

function setPlaying(value) {
  playing = value && last > 0
  playButton.textContent = playing ? 'Pause' : 'Play'
  if (playing && frame >= last) frame = 0
  if (playing) {
    then = 0
    carry = 0
    requestAnimationFrame(tick)
  }
}

function tick(now) {
  if (!playing) return
  if (then > 0) carry += (Math.min(0.25, (now - then) / 1000) * Number(speedSelect.value)) / secondsPerFrame
  then = now
  const steps = Math.floor(carry)
  carry -= steps
  if (steps > 0) {
    // Rests at the end for a second of its own time, then begins anew.
    const rest = Math.round(1 / secondsPerFrame)
    pause = frame + steps > last ? pause + steps : 0
    frame = pause > rest ? 0 : Math.min(last, frame + steps)
    if (frame === 0) pause = 0
    show()
  }
  requestAnimationFrame(tick)
}
let pause = 0

function go(to) {
  frame = Math.min(last, Math.max(0, Math.round(to)))
  pause = 0
  show()
}

const keys = {
  ArrowLeft: (event) => go(frame - (event.shiftKey ? 10 : 1)),
  ArrowRight: (event) => go(frame + (event.shiftKey ? 10 : 1)),
  Home: () => go(0),
  End: () => go(last),
  ' ': () => setPlaying(!playing),
}
stage.addEventListener('keydown', (event) => {
  const act = keys[event.key]
  if (!act || event.ctrlKey || event.altKey || event.metaKey) return
  if (event.key !== ' ') setPlaying(false)
  act(event)
  event.preventDefault()
})
playButton.addEventListener('click', () => setPlaying(!playing))
scrub.addEventListener('input', () => {
  setPlaying(false)
  go(Number(scrub.value))
})
for (const box of [followBox, traceBox]) box.addEventListener('change', show)
darkness.addEventListener('change', show)
reduced.addEventListener('change', () => reduced.matches && setPlaying(false))
new ResizeObserver(show).observe(stage)
// #at=3.2 opens a moment, paused: a link to what one wants to show.
const wanted = /^#at=(\d+(\.\d+)?)$/.exec(location.hash)
if (wanted) {
  playing = false
  frame = Math.min(last, Math.round(Number(wanted[1]) / secondsPerFrame))
}
show()
setPlaying(playing)
