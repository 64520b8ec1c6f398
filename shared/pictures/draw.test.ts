// What a drawing promises, read off its display list: everything in view, nothing missing, lengths true, the same list on
// paper and canvas.

import { describe, expect, it } from 'vitest'
import { linkageFrames, solidFrames, trussFrames } from '../../tests/frames-fixture.js'
import type { Frames } from '../frames.js'
import { type Box, BoxMaker } from './boxes.js'
import { drawMoment } from './draw.js'
import { scaleBarM } from './draw-furniture.js'
import { drawStrip, stripFromPx, stripHeightPx, touchingNodes } from './draw-strip.js'
import { legendRows, sampleHeightPx, sampleWidthPx } from './legend.js'
import { momentAt } from './moment.js'
import { drawMoments } from './moments.js'
import type { Discs, Lines, Operation, Role, Words } from './operations.js'
import { type Pen, paintCanvas } from './paint-canvas.js'
import { svgElements } from './paint-svg.js'
import { startPlayer } from './player.js'
import { sideCamera } from './projection.js'
import { sceneOf } from './scene.js'
import { drawStage, stageInsets, stageView } from './stage.js'
import { light } from './style.js'
import { fitBox, followBox, nearness, pxOf, type Rectangle } from './view.js'

const machines: readonly (readonly [string, Frames])[] = [
  ['a flat truss', trussFrames({ bays: 6, chains: 1, frames: 60 })],
  ['a truss in a pipe', trussFrames({ bays: 5, chains: 3, frames: 60 })],
  ['a linkage', linkageFrames(60)],
  ['rigid solids', solidFrames(60)],
]
const stage: Rectangle = { leftPx: 0, topPx: 0, widthPx: 900, heightPx: 420 }
const everything = { showsWay: true, hasAxis: true, hasScaleBar: true, hasTime: true }

const linesOf = (operations: readonly Operation[], role: Role) =>
  operations.filter((one): one is Lines => one.shape === 'lines' && one.role === role)
const discsOf = (operations: readonly Operation[], role: Role) =>
  operations.filter((one): one is Discs => one.shape === 'discs' && one.role === role)
const wordsOf = (operations: readonly Operation[], role: Role) =>
  operations.filter((one): one is Words => one.shape === 'words' && one.role === role)
const count = (operations: readonly Operation[], role: Role) =>
  linesOf(operations, role).reduce((sum, { lines }) => sum + lines.length, 0)

/** All points of an operation. */
function pointsOf(operation: Operation): (readonly [number, number])[] {
  if (operation.shape === 'words') return [[operation.x, operation.y]]
  const flat =
    operation.shape === 'lines' ? operation.lines.flat() : operation.discs.filter((_, i) => i % 3 !== 2)
  return Array.from({ length: flat.length / 2 }, (_, i) => [flat[2 * i]!, flat[2 * i + 1]!] as const)
}

/** How far the farthest point lies outside, in pixels. */
function outside(
  points: readonly (readonly [number, number])[],
  { leftPx, topPx, widthPx, heightPx }: Rectangle,
): number {
  return points.reduce(
    (most, [x, y]) => Math.max(most, leftPx - x, x - leftPx - widthPx, topPx - y, y - topPx - heightPx),
    0,
  )
}

describe.each(machines)('the drawing of %s', (_, frames) => {
  const scene = sceneOf(frames)
  const drivenLinks = frames.drive.length
  const player = startPlayer(scene, true)

  it.each([360, 900, 2560])('holds the whole machine in view at every moment, %i pixels wide', (widthPx) => {
    const rectangle = { ...stage, widthPx, heightPx: 0.4 * widthPx }
    const kept: readonly Role[] = ['strut', 'actuator', 'node', 'body', 'marker', 'time', 'scale']
    for (const follows of [true, false]) {
      for (const at of [0, 7.5, 30, scene.lastFrame]) {
        const drawn = drawStage(scene, { ...player, follows, at }, rectangle, widthPx / 1000)
        for (const operation of drawn.filter(({ role }) => kept.includes(role))) {
          expect(outside(pointsOf(operation), rectangle), operation.role).toBe(0)
        }
      }
    }
  })
  it('draws every strut, actuator, node, touching node, marker and body, whatever the camera', () => {
    for (const turnRad of [0, 0.7, -2.5]) {
      const camera = frames.dimensions === 3 ? { turnRad, tiltRad: Math.abs(turnRad) / 2 } : sideCamera
      const drawn = drawStage(scene, { ...player, camera, at: 12 }, stage, 1)
      expect(count(drawn, 'strut')).toBe(frames.links.length - drivenLinks)
      expect(count(drawn, 'actuator')).toBe(drivenLinks)
      const discs = (role: Role) => discsOf(drawn, role).reduce((sum, one) => sum + one.discs.length / 3, 0)
      expect(discs('node')).toBe(scene.nodeCount)
      expect(discs('marker')).toBe(frames.markers.length)
      const touching = frames.contacts?.[12]?.reduce((sum, one) => sum + one, 0) ?? 0
      expect(count(drawn, 'contact')).toBe(touching)
      const faces = (role: 'machine' | 'load') =>
        (frames.bodies ?? []).reduce(
          (sum, body) => sum + (body.role === role ? (body.faces?.length ?? 1) : 0),
          0,
        )
      expect(count(drawn, 'body') + discsOf(drawn, 'body').length).toBeGreaterThanOrEqual(faces('machine'))
      expect(count(drawn, 'load') + discsOf(drawn, 'load').length).toBeGreaterThanOrEqual(faces('load'))
    }
  })
  it('shows its walls, whether it follows or not', () => {
    if (frames.walls === undefined) return
    for (const follows of [true, false])
      for (const at of [0, scene.lastFrame])
        expect(count(drawStage(scene, { ...player, follows, at }, stage, 1), 'wall')).toBeGreaterThan(0)
  })
  it('has a scale bar as long as it says', () => {
    for (const widthPx of [360, 900, 2560]) {
      const rectangle = { ...stage, widthPx }
      const view = stageView(scene, player, rectangle, 1)
      const drawn = drawStage(scene, player, rectangle, 1)
      const [bar] = linesOf(drawn, 'scale')
      const xs = bar!.lines[0]!.filter((_, i) => i % 2 === 0)
      const metres = lengthSaid(wordsOf(drawn, 'scale')[0]!.text)
      expect(metres).toBeCloseTo(scaleBarM(view), 12)
      expect((Math.max(...xs) - Math.min(...xs)) / view.pxPerM).toBeCloseTo(metres, 9)
      expect(Math.max(...xs) - Math.min(...xs)).toBeGreaterThan(0.08 * widthPx)
      expect(Math.max(...xs) - Math.min(...xs)).toBeLessThan(0.25 * widthPx)
      // Two places that far apart along the picture are that many pixels apart.
      const { right } = view.axes
      const [x0] = pxOf(view, 0, 0, 0)
      const [x1] = pxOf(view, metres * right[0], metres * right[1], metres * right[2])
      expect(x1 - x0).toBeCloseTo(Math.max(...xs) - Math.min(...xs), 6)
    }
  })
  it('says the time', () => {
    const drawn = drawStage(scene, { ...player, at: 12.5 }, stage, 1)
    expect(wordsOf(drawn, 'time').map(({ text }) => text)).toEqual([
      `${(12.5 * frames.secondsPerFrame).toFixed(2)} s`,
    ])
  })
  it('is the same list on paper and on canvas: same points, same order', () => {
    const drawn = drawStage(scene, { ...player, at: 20 }, stage, 1)
    const onCanvas: number[] = []
    paintCanvas(
      recordingPen((x, y) => onCanvas.push(x, y)),
      drawn,
      light,
    )
    const onPaper = [
      ...svgElements(drawn).matchAll(
        / d="([^"]*)"|<circle cx="([-\d.]+)" cy="([-\d.]+)" r="([\d.]+)"|<text class="[^"]*" x="([-\d.]+)" y="([-\d.]+)"/g,
      ),
    ].flatMap(([, path, cx, cy, r, x, y]) => {
      if (path !== undefined) return path.match(/-?[\d.]+/g)!.map(Number)
      return cx === undefined ? [Number(x), Number(y)] : [Number(cx) + Number(r), Number(cy)]
    })
    expect(onPaper.length).toBe(onCanvas.length)
    expect(onPaper.length).toBeGreaterThan(20)
    // Paper is written in tenths of a pixel.
    for (const [i, value] of onPaper.entries()) expect(Math.abs(value - onCanvas[i]!)).toBeLessThan(0.11)
  })
  it('has a legend row with a sample for everything it shows', () => {
    const rows = legendRows(scene)
    const said = rows.map(({ words }) => words).join('; ')
    const kinds = frames.links.map(({ kind }) => kind)
    const labels = [
      ...frames.markers,
      ...(frames.walls ?? []),
      ...(frames.bodies ?? []),
      ...(frames.motors ?? []),
    ]
    for (const word of [...kinds, ...labels.map(({ label }) => label)]) expect(said).toContain(word)
    if (frames.contacts) expect(said).toContain('touches')
    for (const { sample, words } of rows) {
      expect(sample.length).toBeGreaterThan(0)
      const box = { leftPx: 0, topPx: 0, widthPx: sampleWidthPx, heightPx: sampleHeightPx }
      expect(outside(sample.flatMap(pointsOf), box), words).toBe(0)
    }
  })
  it('keeps stills within their sheet', () => {
    for (const widthPx of [600, 1112]) {
      const { operations, heightPx, shown } = drawMoments(scene, {
        leftPx: 20,
        topPx: 100,
        widthPx,
        unit: 1.2,
      })
      const sheet = { leftPx: 20, topPx: 100, widthPx, heightPx }
      expect(shown[0]).toBe(0)
      expect(shown[shown.length - 1]).toBe(scene.lastFrame)
      for (const operation of operations) {
        expect(outside(pointsOf(operation), sheet), operation.role).toBeLessThanOrEqual(1)
      }
    }
  })
})

function lengthSaid(text: string): number {
  const [, value, unit] = /^([\d.]+) (µm|mm|m)\b/.exec(text)!
  return Number(value) * { µm: 1e-6, mm: 1e-3, m: 1 }[unit as 'm']
}

/** Tells every place that is drawn to; a disc tells where its edge begins. */
function recordingPen(at: (x: number, y: number) => void): Pen {
  const nothing = () => {}
  return {
    ...{ lineWidth: 1, lineCap: 'butt', lineJoin: 'miter', globalAlpha: 1, font: '', textAlign: 'start' },
    ...{
      fillStyle: '',
      strokeStyle: '',
      beginPath: nothing,
      closePath: nothing,
      arc: nothing,
      fill: nothing,
    },
    ...{ stroke: nothing, setLineDash: nothing, strokeText: nothing },
    moveTo: at,
    lineTo: at,
    fillText: (_, x, y) => at(x, y),
  } as Pen
}

describe('contact, activity and stiffness', () => {
  const frames = machines[0]![1]
  const scene = sceneOf(frames)
  const drawn = drawStage(scene, { ...startPlayer(scene, true), at: 9 }, stage, 1)
  it('contact is a shape of its own, three corners with its tip in the node', () => {
    const [first] = linesOf(drawn, 'contact')
    expect(first!.isClosed).toBe(true)
    expect(first!.fill).toBeDefined()
    for (const line of first!.lines) expect(line).toHaveLength(6)
    const nodes = discsOf(drawn, 'node')[0]!.discs
    const [x, y] = first!.lines[0]!
    expect(nodes.some((value, i) => i % 3 === 0 && value === x && nodes[i + 1] === y)).toBe(true)
  })
  it('bars of actuators point outwards when driven longer, inwards when driven shorter, and get bolder', () => {
    const [look] = scene.kinds.filter(({ isActive }) => isActive)
    const bend = (drive: number) => {
      const values = Float64Array.of(drive)
      const one: Frames = {
        ...frames,
        positions: [frames.positions[0]!],
        drive: [{ link: look!.links[0]!, values }],
        contacts: [frames.contacts![0]!],
      }
      const its = sceneOf(one)
      const bars = linesOf(drawStage(its, startPlayer(its, true), stage, 1), 'hatch').at(-1)!
      const [first] = bars.lines
      // A bar: edge, middle, edge. Towards the first node's side is outwards for the first bar.
      const along = [first![2]! - (first![0]! + first![4]!) / 2, first![3]! - (first![1]! + first![5]!) / 2]
      const [a, b] = [one.links[look!.links[0]!]!.a, one.links[look!.links[0]!]!.b]
      const way = [
        one.positions[0]![2 * b]! - one.positions[0]![2 * a]!,
        -(one.positions[0]![2 * b + 1]! - one.positions[0]![2 * a + 1]!),
      ]
      return { outwards: -(along[0]! * way[0]! + along[1]! * way[1]!), widthPx: bars.widthPx! }
    }
    expect(bend(1).outwards).toBeGreaterThan(0)
    expect(bend(-1).outwards).toBeLessThan(0)
    expect(bend(0).outwards).toBeCloseTo(0, 12)
    expect(bend(1).widthPx).toBeGreaterThan(1.5 * bend(0).widthPx)
  })
  it('stiffer struts are bolder on the picture, at every size', () => {
    for (const widthPx of [360, 900, 2560]) {
      const struts = linesOf(
        drawStage(scene, startPlayer(scene, true), { ...stage, widthPx }, widthPx / 1000),
        'strut',
      )
      const widths = struts.map((one) => one.widthPx!)
      expect(widths).toHaveLength(3)
      expect(widths[1]! / widths[0]!).toBeGreaterThan(1.25)
      expect(widths[2]! / widths[1]!).toBeGreaterThan(1.25)
    }
  })
})

describe('motors', () => {
  const frames = machines[2]![1]
  const scene = sceneOf(frames)
  const drawnAt = (at: number) => drawStage(scene, { ...startPlayer(scene, true), at }, stage, 1)
  it('of hinges show an arc the way they are driven, of slides an arrow out or in', () => {
    const [slide, hinge] = frames.motors!
    expect([slide!.slidesFrom, hinge!.slidesFrom]).toEqual([0, undefined])
    for (const at of [0, 20, 29]) {
      const drawn = drawnAt(at)
      const [x0, y0, , x1, y1] = discsOf(drawn, 'node')[0]!.discs
      const [, arrow, arc] = linesOf(drawn, 'motor').map(({ lines }) => lines[0]!)
      const out = (arrow![2]! - x1!) * (x1! - x0!) + (arrow![3]! - y1!) * (y1! - y0!)
      expect(Math.sign(out)).toBe(Math.sign(slide!.values[at]!))
      // The arc starts at the top; counter-clockwise it leaves to the left.
      if (arc !== undefined) expect(Math.sign(arc[0]! - arc[2]!)).toBe(Math.sign(hinge!.values[at]!))
      expect(arc !== undefined).toBe(Math.abs(hinge!.values[at]!) > 0.02)
    }
  })
})

describe('a body of 300 struts', () => {
  it.each([
    [1, 75],
    [3, 18],
  ])('costs few strokes of the pen, in %i chains of nodes', (chains, bays) => {
    // Time belongs to the machine; the number of strokes, which it goes with, does not.
    const frames = trussFrames({ bays, chains, frames: 3 })
    const scene = sceneOf(frames)
    const drawn = drawStage(scene, { ...startPlayer(scene, true), at: 1 }, stage, 1)
    expect(frames.links.length).toBeGreaterThan(280)
    expect(drawn.length).toBeLessThan(chains === 1 ? 50 : 400)
    let places = 0
    paintCanvas(
      recordingPen(() => places++),
      drawn,
      light,
    )
    expect(places / frames.links.length).toBeLessThan(30)
  })
})

describe('the turntable', () => {
  const frames = machines[1]![1]
  const scene = sceneOf(frames)
  const player = startPlayer(scene, true)
  const view = stageView(scene, player, stage, 1)
  const places = Array.from({ length: scene.nodeCount }, (_, node) => {
    const [x, y, z] = frames.positions[0]!.subarray(3 * node, 3 * node + 3)
    return { px: pxOf(view, x!, y!, z!), near: nearness(view, x!, y!, z!) }
  })
  const nodeAt = (x: number, y: number) =>
    places.findIndex(({ px }) => Math.abs(px[0] - x) + Math.abs(px[1] - y) < 1e-6)
  it('paints nearer struts later, but for a slice, and every node after the struts that end in it', () => {
    const nears = places.map(({ near }) => near)
    // Fourteen slices make the depth of the machine.
    const sliceM = (Math.max(...nears) - Math.min(...nears)) / 14
    const painted = new Set<number>()
    let [farthest, struts] = [-Infinity, 0]
    for (const operation of drawStage(scene, player, stage, 1)) {
      if (operation.shape === 'discs' && operation.role === 'node')
        for (let i = 0; i < operation.discs.length; i += 3)
          painted.add(nodeAt(operation.discs[i]!, operation.discs[i + 1]!))
      if (operation.shape !== 'lines' || (operation.role !== 'strut' && operation.role !== 'actuator'))
        continue
      for (const [x0, y0, x1, y1] of operation.lines) {
        const ends = [nodeAt(x0!, y0!), nodeAt(x1!, y1!)]
        for (const end of ends) expect(painted.has(end)).toBe(false)
        const near = (nears[ends[0]!]! + nears[ends[1]!]!) / 2
        expect(near).toBeGreaterThan(farthest - 1.001 * sliceM)
        farthest = Math.max(farthest, near)
        struts++
      }
    }
    expect(struts).toBe(frames.links.length)
    expect(painted.size).toBe(scene.nodeCount)
  })
  it('shows plain views from the side, the front and above', () => {
    const see = (turnRad: number, tiltRad: number, point: readonly [number, number, number]) => {
      const box: Box = { low: [-1, -1, -1], high: [1, 1, 1] }
      const view = fitBox(box, scene, { turnRad, tiltRad }, stage, stageInsets(1), 1)
      const [x0, y0] = pxOf(view, 0, 0, 0)
      const [x, y] = pxOf(view, ...point)
      return [(x - x0) / view.pxPerM, (y0 - y) / view.pxPerM].map((v) => Math.round(v * 1e9) / 1e9 + 0)
    }
    const point = [0.1, 0.2, 0.3] as const
    expect(see(0, 0, point)).toEqual([0.1, 0.2])
    expect(see(-Math.PI / 2, 0, point)).toEqual([-0.3, 0.2])
    expect(see(0, Math.PI / 2, point)).toEqual([0.1, -0.3])
  })
  it('keeps lengths across the line of sight true and never makes any longer', () => {
    const box: Box = { low: [-1, -1, -1], high: [1, 1, 1] }
    for (const [turnRad, tiltRad] of [
      [0.3, 0.2],
      [2, 1.1],
      [-1.3, 0.9],
    ] as const) {
      const view = fitBox(box, scene, { turnRad, tiltRad }, stage, stageInsets(1), 1)
      const { right, up, near } = view.axes
      for (const [a, b] of [
        [right, up],
        [up, near],
        [right, near],
      ] as const)
        expect(a[0] * b[0] + a[1] * b[1] + a[2] * b[2]).toBeCloseTo(0, 12)
      for (const one of [right, up, near]) expect(Math.hypot(...one)).toBeCloseTo(1, 12)
    }
  })
  it('draws a shadow straight below and a ground grid of round step', () => {
    const drawn = drawMoment(
      scene,
      momentAt(frames, 3),
      stageView(scene, { ...player, at: 3 }, stage, 1),
      everything,
    )
    expect(count(drawn, 'shadow')).toBe(frames.links.length + frames.markers.length)
    expect(count(drawn, 'ground')).toBeGreaterThan(10)
    const camera = { turnRad: 0, tiltRad: 0 }
    const flat = drawStage(scene, { ...player, camera }, stage, 1)
    // From the side the ground is its profile: every shadow lies on it, below its strut.
    const view = stageView(scene, { ...player, camera }, stage, 1)
    const [, ground] = pxOf(view, 0, 0, 0)
    for (const line of linesOf(flat, 'shadow')[0]!.lines) expect(line[1]).toBeCloseTo(ground, 6)
  })
})

describe('following', () => {
  const frames = trussFrames({ bays: 3, chains: 1, frames: 400 })
  const scene = sceneOf(frames)
  it('keeps one scale over the whole run, and the machine larger than in the whole way', () => {
    const player = startPlayer(scene, true)
    const scales = [0, 50, 133.5, 399].map((at) => stageView(scene, { ...player, at }, stage, 1).pxPerM)
    for (const scale of scales) expect(scale).toBeCloseTo(scales[0]!, 6)
    expect(scales[0]!).toBeGreaterThan(1.2 * stageView(scene, { ...player, follows: false }, stage, 1).pxPerM)
  })
  it('moves with the machine, without shaking', () => {
    const middle = (at: number) => (followBox(scene, at).low[0] + followBox(scene, at).high[0]) / 2
    const steps = Array.from({ length: 300 }, (_, i) => middle(50 + i) - middle(49 + i))
    const mean = steps.reduce((sum, step) => sum + step, 0) / steps.length
    expect(mean).toBeCloseTo(0.06 * frames.secondsPerFrame, 5)
    for (const step of steps) expect(Math.abs(step - mean)).toBeLessThan(0.25 * mean)
  })
})

describe('the strip below', () => {
  const frames = machines[0]![1]
  const scene = sceneOf(frames)
  it('has a lane a group and a bar for every stretch of contact', () => {
    const rectangle = { leftPx: 0, topPx: 0, widthPx: 800, heightPx: stripHeightPx(scene, 1) }
    const drawn = drawStrip(scene, rectangle, 1)
    expect(wordsOf(drawn, 'strip').map(({ text }) => text)).toEqual([
      'actuator 1',
      'actuator 2',
      'actuator 3',
      'actuator 4',
      'contact, 7 nodes',
    ])
    let stretches = 0
    for (const node of touchingNodes(frames))
      for (const [frame, now] of frames.contacts!.entries())
        if (now[node] === 1 && frames.contacts![frame - 1]?.[node] !== 1) stretches++
    expect(linesOf(drawn, 'strip').at(-1)!.lines).toHaveLength(stretches)
    expect(outside(drawn.flatMap(pointsOf), rectangle)).toBe(0)
    expect(stripFromPx(rectangle, 1)).toBeLessThan(200)
  })
  it('takes no room where there is nothing to show', () => {
    expect(stripHeightPx(sceneOf(machines[3]![1]), 1)).toBe(0)
  })
})

describe('what a problem wants to be said', () => {
  it('stands in motion and in stills, and a label counts in the view', () => {
    const note = 'motion drawn 60 times larger'
    const labels = [{ text: 'lip', atM: [0.1, 0.4] }]
    const scene = sceneOf({ ...machines[0]![1], note, labels })
    const drawn = drawStage(scene, startPlayer(scene, true), stage, 1)
    expect(wordsOf(drawn, 'note').map(({ text }) => text)).toEqual([note])
    expect(wordsOf(drawn, 'label').map(({ text }) => text)).toEqual(['lip'])
    const stills = drawMoments(scene, { leftPx: 0, topPx: 0, widthPx: 1000, unit: 1 }).operations
    expect(wordsOf(stills, 'note')).toHaveLength(1)
  })
})

describe('boxes', () => {
  it('are undefined until they have seen a point, then hold all of them', () => {
    const maker = new BoxMaker()
    expect(maker.box()).toBeUndefined()
    maker.add(1, 2, 3, 0.5)
    maker.add(-1, 0, 0)
    expect(maker.box()).toEqual({ low: [-1, 0, 0], high: [1.5, 2.5, 3.5] })
  })
})
