// What is wrong with frames, which come from a plug-in. The one place that checks them: who draws trusts them.

import type { FrameBody, FrameGroundGrid, Frames, FrameWall } from '../frames.js'

/** Numbers in all frames together: a replay of 20 MB. */
const numbersMost = 5_000_000

/** A sentence without a full stop; undefined when the frames can be drawn. */
export function framesFault(frames: Frames): string | undefined {
  for (const find of finders) {
    const fault = find(frames)
    if (fault !== undefined) return fault
  }
  return undefined
}

type Finder = (frames: Frames) => string | undefined

const isNumber = (value: unknown) => typeof value === 'number' && Number.isFinite(value)
const allNumbers = (values: Iterable<unknown>) => [...values].every(isNumber)
const nodesOf = ({ positions, dimensions }: Frames) => (positions[0]?.length ?? 0) / dimensions

const finders: readonly Finder[] = [
  ({ dimensions }) =>
    dimensions === 2 || dimensions === 3 ? undefined : `${dimensions} dimensions; expected 2 or 3`,
  ({ secondsPerFrame }) =>
    isNumber(secondsPerFrame) && secondsPerFrame > 0 ? undefined : 'secondsPerFrame is not above 0',
  positionsFault,
  linksFault,
  markersFault,
  ({ ground }) => (allNumbers(ground.flat()) ? undefined : 'the ground has a number that is not finite'),
  driveFault,
  contactsFault,
  (frames) => firstFault(frames.bodies, (body) => bodyFault(body, frames)),
  (frames) => firstFault(frames.walls, (wall) => wallFault(wall, frames)),
  ({ groundGrid }) => (groundGrid === undefined ? undefined : gridFault(groundGrid)),
  placesFault,
]

function firstFault<T>(list: readonly T[] | undefined, find: (one: T) => string | undefined) {
  for (const one of list ?? []) {
    const fault = find(one)
    if (fault !== undefined) return fault
  }
  return undefined
}

function positionsFault(frames: Frames): string | undefined {
  const { positions, dimensions, bodies } = frames
  const first = positions[0]
  if (!first || (first.length === 0 && (bodies ?? []).length === 0)) return 'no frame with a node or a body'
  if (!Number.isInteger(nodesOf(frames)))
    return `${first.length} numbers in a frame of ${dimensions} dimensions`
  for (const [index, frame] of positions.entries()) {
    if (frame.length !== first.length)
      return `frame ${index} has ${frame.length} numbers, the first ${first.length}`
    if (!frame.every(Number.isFinite)) return `frame ${index} has a number that is not finite`
  }
  const eachFrame = first.length + (dimensions === 2 ? 3 : 7) * (bodies ?? []).length
  return positions.length * eachFrame > numbersMost
    ? `more than ${numbersMost} numbers: give fewer frames a second`
    : undefined
}

function linksFault(frames: Frames): string | undefined {
  const isNode = nodeTest(frames)
  if (!frames.links.every(({ a, b }) => isNode(a) && isNode(b)))
    return 'a link names a node that is not there'
  const isWeight = (weight: number | undefined) =>
    weight === undefined || (isNumber(weight) && weight >= 0 && weight <= 1)
  if (!frames.links.every(({ weight }) => isWeight(weight))) return 'the weight of a link is not from 0 to 1'
  return undefined
}

function nodeTest(frames: Frames): (node: number) => boolean {
  const nodes = nodesOf(frames)
  return (node) => Number.isInteger(node) && node >= 0 && node < nodes
}

function markersFault(frames: Frames): string | undefined {
  const isNode = nodeTest(frames)
  if (!frames.markers.every(({ node, radiusM }) => isNode(node) && isNumber(radiusM)))
    return 'a marker names a node that is not there'
  const nodes = nodesOf(frames)
  if (frames.nodeRadiiM.length !== nodes) return `${frames.nodeRadiiM.length} node radii for ${nodes} nodes`
  return allNumbers(frames.nodeRadiiM) ? undefined : 'a node radius is not a finite number'
}

function driveFault(frames: Frames): string | undefined {
  const { links, positions, motors } = frames
  const fits = (values: Float64Array) => values.length === positions.length && values.every(Number.isFinite)
  const isLink = (link: number) => Number.isInteger(link) && link >= 0 && link < links.length
  if (!frames.drive.every(({ link, values }) => isLink(link) && fits(values)))
    return 'the drive does not fit links and frames'
  const isNode = nodeTest(frames)
  if (
    !(motors ?? []).every(
      ({ node, values, slidesFrom }) => isNode(node) && isNode(slidesFrom ?? node) && fits(values),
    )
  )
    return 'a motor does not fit nodes and frames'
  return undefined
}

function contactsFault(frames: Frames): string | undefined {
  const { contacts, positions } = frames
  if (contacts === undefined) return undefined
  const nodes = nodesOf(frames)
  return contacts.length === positions.length && contacts.every(({ length }) => length === nodes)
    ? undefined
    : 'the contacts do not fit nodes and frames'
}

function bodyFault(body: FrameBody, { dimensions, positions }: Frames): string | undefined {
  const name = `the body '${body.label}'`
  const corners = body.cornersM.length / dimensions
  if (!(corners >= 1) || !Number.isInteger(corners) || !allNumbers(body.cornersM))
    return `${name} has no whole number of finite corners`
  if (body.radiusM !== undefined && !(isNumber(body.radiusM) && body.radiusM >= 0))
    return `${name} has a radius below 0`
  const isCorner = (corner: number) => Number.isInteger(corner) && corner >= 0 && corner < corners
  if (!(body.faces ?? []).every((face) => face.every(isCorner)))
    return `${name} names a corner that is not there`
  const numbers = dimensions === 2 ? 3 : 7
  const isPose = (pose: Float64Array) => pose.length === numbers && pose.every(Number.isFinite)
  return body.poses.length === positions.length && body.poses.every(isPose)
    ? undefined
    : `${name} does not have ${numbers} finite numbers in each frame`
}

function wallFault({ label, pointsM }: FrameWall, { dimensions }: Frames): string | undefined {
  return Number.isInteger(pointsM.length / dimensions) && allNumbers(pointsM)
    ? undefined
    : `the wall '${label}' has no whole number of finite points`
}

function gridFault(grid: FrameGroundGrid): string | undefined {
  const { countX, countZ, heightsM, spacingXM, spacingZM, firstXM, firstZM } = grid
  const isSound =
    Number.isInteger(countX) &&
    Number.isInteger(countZ) &&
    countX >= 2 &&
    countZ >= 2 &&
    heightsM.length === countX * countZ &&
    heightsM.every(Number.isFinite) &&
    allNumbers([spacingXM, spacingZM, firstXM, firstZM]) &&
    spacingXM > 0 &&
    spacingZM > 0
  return isSound ? undefined : 'the grid of the ground does not fit its heights'
}

function placesFault({ labels, worthSeeing, dimensions }: Frames): string | undefined {
  const isPlace = (place: readonly number[]) => place.length === dimensions && allNumbers(place)
  if (!(labels ?? []).every(({ atM }) => isPlace(atM))) return 'a label has no place'
  if (worthSeeing === undefined) return undefined
  const isBox =
    isPlace(worthSeeing.lowM) &&
    isPlace(worthSeeing.highM) &&
    worthSeeing.lowM.every((low, i) => low < worthSeeing.highM[i]!)
  return isBox ? undefined : 'what is worth seeing has no size'
}
