// Everything at one time of a run. Between two frames places go on straight lines and drives change evenly, so that
// slow motion is smooth; contact is that of the earlier frame.

import { check } from '../check.js'
import { cos, sin } from '../detmath/trigonometry.js'
import type { FrameBody, Frames } from '../frames.js'

export interface Moment {
  /** Frames from the start; whole numbers are the recorded frames. */
  readonly at: number
  readonly positions: Float64Array
  /** Absent where the frames do not say. */
  readonly contacts?: Uint8Array
  /** One a body. */
  readonly poses: readonly Float64Array[]
  /** Value of a drive or motor series now. */
  readonly valueOf: (series: Float64Array) => number
}

export function momentAt(frames: Frames, at: number): Moment {
  const last = frames.positions.length - 1
  check(at >= 0 && at <= last, 'a moment lies in the run')
  const before = Math.floor(at)
  const share = at - before
  const after = Math.min(last, before + 1)
  const between = (a: Float64Array, b: Float64Array) =>
    share === 0 ? a : a.map((v, i) => v + share * (b[i]! - v))
  const contacts = frames.contacts?.[before]
  return {
    at,
    positions: between(frames.positions[before]!, frames.positions[after]!),
    ...(contacts ? { contacts } : {}),
    poses: (frames.bodies ?? []).map(({ poses }) => {
      const [a, b] = [poses[before]!, poses[after]!]
      if (share === 0) return a
      return frames.dimensions === 2 ? between(a, b) : betweenTurns(a, b, share)
    }),
    valueOf: (series) => series[before]! + share * (series[after]! - series[before]!),
  }
}

/** Quaternions q and -q are one turn: the shorter way is taken, then the length is put right. */
function betweenTurns(a: Float64Array, b: Float64Array, share: number): Float64Array {
  let same = 0
  for (let i = 3; i < 7; i++) same += a[i]! * b[i]!
  const sign = same < 0 ? -1 : 1
  const pose = a.map((v, i) => v + share * ((i < 3 ? 1 : sign) * b[i]! - v))
  let square = 0
  for (let i = 3; i < 7; i++) square += pose[i]! * pose[i]!
  const perLength = square > 0 ? 1 / Math.sqrt(square) : 1
  return pose.map((v, i) => (i < 3 ? v : v * perLength))
}

/** Corners of a body in the world, as x, y, z triples. */
export function cornersOf(body: FrameBody, pose: Float64Array): number[] {
  return pose.length === 3 ? flatCorners(body, pose) : solidCorners(body, pose)
}

function flatCorners({ cornersM }: FrameBody, pose: Float64Array): number[] {
  const [cosine, sine] = [cos(pose[2]!), sin(pose[2]!)]
  const corners: number[] = []
  for (let i = 0; i < cornersM.length; i += 2) {
    const [x, y] = [cornersM[i]!, cornersM[i + 1]!]
    corners.push(pose[0]! + cosine * x - sine * y, pose[1]! + sine * x + cosine * y, 0)
  }
  return corners
}

/** v + 2 w (q x v) + 2 q x (q x v), with the unit quaternion (q, w). */
function solidCorners({ cornersM }: FrameBody, pose: Float64Array): number[] {
  const [x0, y0, z0] = [pose[0]!, pose[1]!, pose[2]!]
  const [qx, qy, qz, qw] = [pose[3]!, pose[4]!, pose[5]!, pose[6]!]
  const corners: number[] = []
  for (let i = 0; i < cornersM.length; i += 3) {
    const [x, y, z] = [cornersM[i]!, cornersM[i + 1]!, cornersM[i + 2]!]
    const tx = 2 * (qy * z - qz * y)
    const ty = 2 * (qz * x - qx * z)
    const tz = 2 * (qx * y - qy * x)
    corners.push(
      x0 + x + qw * tx + qy * tz - qz * ty,
      y0 + y + qw * ty + qz * tx - qx * tz,
      z0 + z + qw * tz + qx * ty - qy * tx,
    )
  }
  return corners
}
