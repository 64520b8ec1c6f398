// One moment of a scene as a display list: the one drawing routine behind stills and motion, in 2-D and 3-D.
//
// In 2-D everything lies in one plane and is drawn by kind. In 3-D the machine is cut into slices from far to near; each
// slice is drawn like a 2-D picture over a halo of paper, so that nearer struts visibly pass before farther ones.

import type { Point } from './boxes.js'
import { clippedLine } from './clip.js'
import { bodyOutlines, bodyPieces, type Piece } from './draw-bodies.js'
import {
  axisOperations,
  labelOperations,
  motorOperations,
  scaleBarOperations,
  timeOperations,
  tripodOperations,
} from './draw-furniture.js'
import { flatWallOperations, gridOperations, groundOperations, solidWallOperations } from './draw-ground.js'
import {
  contactOperation,
  type LinkBatch,
  linkOperations,
  nodeOperation,
  sleevePx,
  strutWidthPx,
  type Weights,
} from './draw-links.js'
import type { Moment } from './moment.js'
import type { Operation } from './operations.js'
import type { Scene } from './scene.js'
import { nearness, pxOf, type View } from './view.js'

export interface DrawOptions {
  /** Where the marked nodes have been so far. */
  readonly showsWay: boolean
  readonly hasAxis: boolean
  readonly hasScaleBar: boolean
  readonly hasTime: boolean
}

interface Drawing {
  readonly scene: Scene
  readonly moment: Moment
  readonly view: View
  readonly weights: Weights
  /** x, y in pixels and how near to the viewer in metres, of every node. */
  readonly nodes: Float64Array
}

/** From what is painted first to what is painted last. */
export function drawMoment(scene: Scene, moment: Moment, view: View, options: DrawOptions): Operation[] {
  const meanLinkPx = scene.meanLinkM * view.pxPerM
  const weights = { unit: view.unit, lineFactor: view.lineFactor, meanLinkPx }
  const drawing = { scene, moment, view, weights, nodes: nodesPx(scene, moment, view) }
  return [
    ...(scene.frames.dimensions === 2 ? flatOperations(drawing, options) : solidOperations(drawing, options)),
    ...markerRings(drawing),
    ...labelOperations(scene, view),
    ...(options.hasAxis && scene.frames.dimensions === 2 ? axisOperations(view) : []),
    ...(options.hasAxis && scene.frames.dimensions === 3 ? tripodOperations(view) : []),
    ...(options.hasScaleBar ? scaleBarOperations(scene, view) : []),
    ...(options.hasTime ? timeOperations(scene, moment, view) : []),
  ]
}

function nodesPx({ nodeCount, frames }: Scene, { positions }: Moment, view: View): Float64Array {
  const nodes = new Float64Array(3 * nodeCount)
  const stride = frames.dimensions
  for (let node = 0; node < nodeCount; node++) {
    const at = node * stride
    const [x, y, z] = [positions[at]!, positions[at + 1]!, stride === 3 ? positions[at + 2]! : 0]
    const [px, py] = pxOf(view, x, y, z)
    nodes[3 * node] = px
    nodes[3 * node + 1] = py
    nodes[3 * node + 2] = nearness(view, x, y, z)
  }
  return nodes
}

function flatOperations(drawing: Drawing, options: DrawOptions): Operation[] {
  const { scene, moment, view } = drawing
  const pieces = bodyPieces(scene, moment, view)
  return [
    ...groundOperations(scene, view),
    ...flatWallOperations(scene, view),
    ...(options.showsWay ? wayOperations(drawing) : []),
    ...markerPlates(drawing),
    ...pieces.flatMap(({ operations }) => operations),
    ...scene.kinds.flatMap((look) => linkOperations(batchOf(drawing, look), drawing.weights)),
    ...nodeParts(drawing, allNodes(scene)),
    ...motorOperations(scene, moment, view, drawing.nodes),
  ]
}

function allNodes({ nodeCount }: Scene): number[] {
  return Array.from({ length: nodeCount }, (_, node) => node)
}

/** All links of a kind, or those among `chosen` (places in the kind's own list). */
function batchOf(
  { scene, moment, nodes }: Drawing,
  look: Scene['kinds'][number],
  chosen?: readonly number[],
): LinkBatch {
  const places = chosen ?? look.links.map((_, place) => place)
  return {
    look,
    lines: places.map((place) => {
      const { a, b } = scene.frames.links[look.links[place]!]!
      return [nodes[3 * a]!, nodes[3 * a + 1]!, nodes[3 * b]!, nodes[3 * b + 1]!]
    }),
    drives: look.isActive
      ? places.map((place) => {
          const series = look.drives[place]
          return series === undefined ? 0 : moment.valueOf(series)
        })
      : [],
  }
}

/** Contact first, so that the node sits on the tip of its triangle. */
function nodeParts({ scene, moment, view, nodes, weights }: Drawing, chosen: readonly number[]): Operation[] {
  const radius = (node: number) =>
    Math.min(
      9 * view.unit,
      Math.max(2.2 * view.unit * view.lineFactor, scene.frames.nodeRadiiM[node]! * view.pxPerM),
    )
  const discsOf = (some: readonly number[]) =>
    some.flatMap((node) => [nodes[3 * node]!, nodes[3 * node + 1]!, radius(node)])
  const touching = chosen.filter((node) => moment.contacts?.[node] === 1)
  return [...contactOperation(discsOf(touching), weights), ...nodeOperation(discsOf(chosen), weights)]
}

const wayPointsMost = 400

/** Where marked nodes have been so far. */
function wayOperations({ scene, moment, view }: Drawing): Operation[] {
  const { frames } = scene
  const last = Math.floor(moment.at)
  if (frames.markers.length === 0 || last === 0) return []
  const stride = Math.max(1, Math.ceil(last / wayPointsMost))
  const lines = frames.markers.map(({ node }) => {
    const line: number[] = []
    const add = (positions: Float64Array) => {
      const at = node * frames.dimensions
      const z = frames.dimensions === 3 ? positions[at + 2]! : 0
      line.push(...pxOf(view, positions[at]!, positions[at + 1]!, z))
    }
    for (let frame = 0; frame <= last; frame += stride) add(frames.positions[frame]!)
    add(moment.positions)
    return line
  })
  return [{ shape: 'lines', role: 'way', lines, stroke: 'way', widthPx: 1.4 * view.unit }]
}

function markerDiscs({ scene, view, nodes }: Drawing): number[] {
  return scene.frames.markers.flatMap(({ node, radiusM }) => [
    nodes[3 * node]!,
    nodes[3 * node + 1]!,
    Math.max(5 * view.unit, radiusM * view.pxPerM),
  ])
}

/** Behind the struts, so that what carries the marker stays visible. */
function markerPlates(drawing: Drawing): Operation[] {
  const discs = markerDiscs(drawing)
  return discs.length === 0
    ? []
    : [{ shape: 'discs', role: 'plate', discs, fill: 'marker', fillOpacity: 0.3 }]
}

/** In front of everything: a ring with a cross, known by its shape. */
function markerRings(drawing: Drawing): Operation[] {
  const discs = markerDiscs(drawing)
  if (discs.length === 0) return []
  const { unit } = drawing.view
  const crosses: number[][] = []
  for (let i = 0; i < discs.length; i += 3) {
    const [x, y, arm] = [discs[i]!, discs[i + 1]!, discs[i + 2]! + 3 * unit]
    for (const [dx, dy] of [
      [1, 0],
      [-1, 0],
      [0, 1],
      [0, -1],
    ] as const)
      crosses.push([x + 0.55 * arm * dx, y + 0.55 * arm * dy, x + arm * dx, y + arm * dy])
  }
  const stroke = { stroke: 'marker', widthPx: 2 * unit } as const
  return [
    { shape: 'discs', role: 'marker', discs, ...stroke },
    { shape: 'lines', role: 'marker', lines: crosses, ...stroke },
  ]
}

const slices = 14

function solidOperations(drawing: Drawing, options: DrawOptions): Operation[] {
  const { scene, moment, view } = drawing
  const walls = solidWallOperations(scene, view, middleOfMachine(scene, moment))
  return [
    ...gridOperations(scene, view),
    ...walls.far,
    ...shadowOperations(drawing),
    ...(options.showsWay ? wayOperations(drawing) : []),
    ...markerPlates(drawing),
    ...sliced(drawing).flatMap((slice) => sliceOperations(drawing, slice)),
    ...motorOperations(scene, moment, view, drawing.nodes),
    ...walls.near,
  ]
}

function middleOfMachine({ middlesM }: Scene, { at }: Moment): Point {
  const frame = 3 * Math.floor(at)
  return [middlesM[frame]!, middlesM[frame + 1]!, middlesM[frame + 2]!]
}

/** Straight below the struts on the ground, and a plumb line from every marker. */
function shadowOperations({ scene, moment, view }: Drawing): Operation[] {
  const { height, frames } = scene
  if (height === undefined) return []
  const at = (node: number) =>
    [moment.positions[3 * node]!, moment.positions[3 * node + 1]!, moment.positions[3 * node + 2]!] as const
  const below = (node: number) => {
    const [x, , z] = at(node)
    return pxOf(view, x, height(x, z), z)
  }
  const look = { shape: 'lines', role: 'shadow', stroke: 'shadow' } as const
  const feet = scene.frames.links.map(({ a, b }) => [...below(a), ...below(b)])
  const pieces = (frames.bodies ?? []).flatMap((body, number) =>
    bodyOutlines(body, moment.poses[number]!).map((outline) =>
      outline.flatMap(([x, z]) => pxOf(view, x, height(x, z), z)),
    ),
  )
  const plumbs = frames.markers.map(({ node }) => [...pxOf(view, ...at(node)), ...below(node)])
  return [
    {
      ...look,
      lines: [...feet, ...pieces].flatMap((line) => clippedLine(line, view)),
      widthPx: 2.2 * view.unit * view.lineFactor,
    },
    { ...look, lines: plumbs, widthPx: view.unit, dashPx: [4 * view.unit, 3 * view.unit] },
  ]
}

interface Slice {
  /** By kind: places in the kind's list of links. */
  readonly links: number[][]
  readonly nodes: number[]
  readonly pieces: Piece[]
}

/** Links, nodes and faces by how near they are; from far to near. */
function sliced(drawing: Drawing): Slice[] {
  const { scene, moment, view, nodes } = drawing
  const pieces = bodyPieces(scene, moment, view).sort((a, b) => a.nearnessM - b.nearnessM)
  let [least, most] = [Infinity, -Infinity]
  const see = (near: number) => {
    least = Math.min(least, near)
    most = Math.max(most, near)
  }
  for (let node = 0; node < scene.nodeCount; node++) see(nodes[3 * node + 2]!)
  for (const { nearnessM } of pieces) see(nearnessM)
  const perM = most > least ? slices / (most - least) : 0
  const made: Slice[] = Array.from({ length: slices }, () => ({
    links: scene.kinds.map(() => []),
    nodes: [],
    pieces: [],
  }))
  const sliceOf = (near: number) => Math.min(slices - 1, Math.floor((near - least) * perM))
  // A node comes after every strut that ends in it, or they would be painted over it.
  const nodeSlices = Array.from({ length: scene.nodeCount }, (_, node) => sliceOf(nodes[3 * node + 2]!))
  for (const [kind, { links }] of scene.kinds.entries()) {
    for (const [place, link] of links.entries()) {
      const { a, b } = scene.frames.links[link]!
      const slice = sliceOf((nodes[3 * a + 2]! + nodes[3 * b + 2]!) / 2)
      made[slice]!.links[kind]!.push(place)
      for (const node of [a, b]) nodeSlices[node] = Math.max(nodeSlices[node]!, slice)
    }
  }
  for (const [node, slice] of nodeSlices.entries()) made[slice]!.nodes.push(node)
  for (const piece of pieces) made[sliceOf(piece.nearnessM)]!.pieces.push(piece)
  return made
}

function sliceOperations(drawing: Drawing, { links, nodes, pieces }: Slice): Operation[] {
  const { scene, weights, view } = drawing
  const batches = links.map((places, kind) => batchOf(drawing, scene.kinds[kind]!, places))
  const halos = batches
    .filter(({ lines }) => lines.length > 0)
    .map(({ lines, look }): Operation => {
      const widthPx = (look.isActive ? sleevePx(weights) : strutWidthPx(look, weights)) + 3 * view.unit
      return { shape: 'lines', role: 'halo', lines: lines.map(shortened), stroke: 'paper', widthPx }
    })
  return [
    ...pieces.flatMap(({ operations }) => operations),
    ...halos,
    ...batches.flatMap((batch) => linkOperations(batch, weights)),
    ...nodeParts(drawing, nodes),
  ]
}

/** A halo that reached the ends would cut into the struts that meet there. */
function shortened([x0, y0, x1, y1]: readonly number[]): number[] {
  const [dx, dy] = [0.12 * (x1! - x0!), 0.12 * (y1! - y0!)]
  return [x0! + dx, y0! + dy, x1! - dx, y1! - dy]
}
