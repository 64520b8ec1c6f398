// Numbers behind the drawings: extents, centres, moments, kinds of links. Metres and seconds; y is up.

import { check } from '../../../shared/check.js'
import type { Frames } from '../../../shared/problem.js'

export interface Extent {
  readonly left: number
  readonly right: number
  readonly bottom: number
  readonly top: number
}

export interface Kind {
  readonly kind: string
  readonly isActive: boolean
}

/** Numbers in all frames together: a replay of 20 MB. */
const numbersMost = 5_000_000

/** What is wrong with frames, which come from a plug-in; undefined when they can be drawn. */
export function framesFault(frames: Frames): string | undefined {
  const { dimensions, positions, links, markers, drive, ground, nodeRadiiM } = frames
  if (dimensions !== 2 && dimensions !== 3) return `${dimensions} dimensions; expected 2 or 3`
  if (!(frames.secondsPerFrame > 0) || !Number.isFinite(frames.secondsPerFrame))
    return 'secondsPerFrame is not above 0'
  const first = positions[0]
  if (!first || first.length === 0) return 'no frame with a node'
  const nodes = first.length / dimensions
  if (!Number.isInteger(nodes)) return `${first.length} numbers in a frame of ${dimensions} dimensions`
  for (const [index, frame] of positions.entries()) {
    if (frame.length !== first.length)
      return `frame ${index} has ${frame.length} numbers, the first ${first.length}`
    if (!frame.every(Number.isFinite)) return `frame ${index} has a number that is not finite`
  }
  if (positions.length * first.length > numbersMost)
    return `more than ${numbersMost} numbers: give fewer frames a second`
  const isNode = (node: number) => Number.isInteger(node) && node >= 0 && node < nodes
  if (!links.every(({ a, b }) => isNode(a) && isNode(b))) return 'a link names a node that is not there'
  if (!markers.every(({ node, radiusM }) => isNode(node) && Number.isFinite(radiusM)))
    return 'a marker names a node that is not there'
  if (nodeRadiiM.length !== nodes) return `${nodeRadiiM.length} node radii for ${nodes} nodes`
  if (!ground.flat().every(Number.isFinite)) return 'the ground has a number that is not finite'
  if (
    !drive.every(({ link, values }) => link >= 0 && link < links.length && values.length === positions.length)
  ) {
    return 'the drive does not fit links and frames'
  }
  return undefined
}

/** Position of a node on the drawing plane; depth (a third dimension) goes up and to the right at half length. */
export function nodeAt(frames: Frames, frame: number, node: number): readonly [number, number] {
  const positions = frames.positions[frame]
  check(positions !== undefined, 'the frame is there')
  const first = node * frames.dimensions
  const x = positions[first]!
  const y = positions[first + 1]!
  if (frames.dimensions === 2) return [x, y]
  const depth = positions[first + 2]!
  return [x + 0.433 * depth, y + 0.25 * depth]
}

export function nodeCount(frames: Frames): number {
  return frames.positions[0]!.length / frames.dimensions
}

/** Smallest box around the nodes of these frames, with the radii of nodes and markers. */
export function extentOf(frames: Frames, moments: readonly number[]): Extent {
  const radius = Math.max(0, ...frames.nodeRadiiM, ...frames.markers.map(({ radiusM }) => radiusM))
  let [left, right, bottom, top] = [Infinity, -Infinity, Infinity, -Infinity]
  for (const frame of moments) {
    for (let node = 0; node < nodeCount(frames); node++) {
      const [x, y] = nodeAt(frames, frame, node)
      left = Math.min(left, x)
      right = Math.max(right, x)
      bottom = Math.min(bottom, y)
      top = Math.max(top, y)
    }
  }
  return { left: left - radius, right: right + radius, bottom: bottom - radius, top: top + radius }
}

/** Evenly spaced frames, first and last among them. */
export function momentsOf(frames: Frames, count: number): number[] {
  const last = frames.positions.length - 1
  const wanted = Math.min(count, last + 1)
  const moments = Array.from({ length: wanted }, (_, i) =>
    wanted === 1 ? 0 : Math.round((i * last) / (wanted - 1)),
  )
  return [...new Set(moments)]
}

export function secondsAt(frames: Frames, frame: number): number {
  return frame * frames.secondsPerFrame
}

/** Kinds of links in order of appearance, driven ones last. */
export function kindsOf(frames: Frames): Kind[] {
  const driven = new Set(frames.drive.map(({ link }) => frames.links[link]?.kind))
  const kinds = [...new Set(frames.links.map(({ kind }) => kind))].map((kind) => ({
    kind,
    isActive: driven.has(kind),
  }))
  const rank = ({ isActive }: Kind) => (isActive ? 1 : 0)
  return kinds.sort(
    (a, b) => rank(a) - rank(b) || (a.isActive ? a.kind.localeCompare(b.kind, 'en', { numeric: true }) : 0),
  )
}

/** A round number (1, 2 or 5 times a power of ten) at most `most`, for ticks and scale bars. */
export function roundStep(most: number): number {
  check(most > 0 && Number.isFinite(most), 'a step has a size')
  const power = 10 ** Math.floor(Math.log10(most))
  return ([5, 2, 1].find((factor) => factor * power <= most * (1 + 1e-9)) ?? 1) * power
}

/** A round number at least `least`: ticks no nearer than that, so that their numbers do not touch. */
export function roundStepUp(least: number): number {
  check(least > 0 && Number.isFinite(least), 'a step has a size')
  const power = 10 ** Math.floor(Math.log10(least))
  return ([1, 2, 5].find((factor) => factor * power >= least * (1 - 1e-9)) ?? 10) * power
}

/** A length as a person writes it: 20 mm, 0.5 m. */
export function lengthText(metres: number): string {
  if (metres < 0.001) return `${Number((metres * 1e6).toPrecision(3))} µm`
  if (metres < 0.1) return `${Number((metres * 1000).toPrecision(3))} mm`
  return `${Number(metres.toPrecision(3))} m`
}
