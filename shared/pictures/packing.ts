// Frames as JSON for a page: many numbers travel as 16-bit steps between their smallest and largest, in base64.
//
//   numbers   { base64, low, step }: little-endian 16-bit whole numbers n, meaning low + step n. A step is 1/65,535 of
//             the extent, far below a pixel. Places of nodes are kept axis by axis, poses number by number.
//   contacts  base64 of one bit a node and frame, lowest bit first, frame after frame

import { check } from '../check.js'
import type { FrameBody, FrameMotor, Frames } from '../frames.js'

export interface PackedNumbers {
  readonly base64: string
  readonly low: number
  readonly step: number
}

/** Plain JSON. The meaning of every field: shared/frames.ts. */
export interface PackedFrames
  extends Omit<Frames, 'positions' | 'drive' | 'contacts' | 'bodies' | 'motors' | 'groundGrid'> {
  readonly frameCount: number
  readonly nodeCount: number
  /** x of all frames and nodes, then y, then z. */
  readonly places: readonly PackedNumbers[]
  readonly drive: readonly { readonly link: number; readonly values: PackedNumbers }[]
  readonly contacts?: string
  readonly bodies?: readonly (Omit<FrameBody, 'poses'> & { readonly poses: readonly PackedNumbers[] })[]
  readonly motors?: readonly (Omit<FrameMotor, 'values'> & { readonly values: PackedNumbers })[]
  readonly groundGrid?: Omit<NonNullable<Frames['groundGrid']>, 'heightsM'> & {
    readonly heightsM: PackedNumbers
  }
}

export function packFrames(frames: Frames): PackedFrames {
  const { positions, drive, contacts, bodies, motors, groundGrid, ...plain } = frames
  const stride = frames.dimensions
  const poseNumbers = stride === 2 ? 3 : 7
  return {
    ...plain,
    frameCount: positions.length,
    nodeCount: positions[0]!.length / stride,
    places: axes(stride).map((axis) =>
      packNumbers(positions.flatMap((frame) => Array.from(frame).filter((_, i) => i % stride === axis))),
    ),
    drive: drive.map(({ link, values }) => ({ link, values: packNumbers(values) })),
    ...(contacts ? { contacts: packBits(contacts) } : {}),
    ...(bodies
      ? {
          bodies: bodies.map(({ poses, ...body }) => ({
            ...body,
            poses: axes(poseNumbers).map((number) => packNumbers(poses.map((pose) => pose[number]!))),
          })),
        }
      : {}),
    ...(motors ? { motors: motors.map((motor) => ({ ...motor, values: packNumbers(motor.values) })) } : {}),
    ...(groundGrid ? { groundGrid: { ...groundGrid, heightsM: packNumbers(groundGrid.heightsM) } } : {}),
  }
}

export function unpackFrames(packed: PackedFrames): Frames {
  const { frameCount, nodeCount, places, drive, contacts, bodies, motors, groundGrid, ...plain } = packed
  const axesOfNodes = places.map(unpackNumbers)
  const stride = axesOfNodes.length
  return {
    ...plain,
    positions: Array.from({ length: frameCount }, (_, frame) =>
      new Float64Array(nodeCount * stride).map(
        (_, i) => axesOfNodes[i % stride]![frame * nodeCount + Math.floor(i / stride)]!,
      ),
    ),
    drive: drive.map(({ link, values }) => ({ link, values: unpackNumbers(values) })),
    ...(contacts === undefined ? {} : { contacts: unpackBits(contacts, frameCount, nodeCount) }),
    ...(bodies
      ? {
          bodies: bodies.map(({ poses, ...body }) => {
            const numbers = poses.map(unpackNumbers)
            return {
              ...body,
              poses: Array.from({ length: frameCount }, (_, frame) =>
                Float64Array.from(numbers, (series) => series[frame]!),
              ),
            }
          }),
        }
      : {}),
    ...(motors ? { motors: motors.map((motor) => ({ ...motor, values: unpackNumbers(motor.values) })) } : {}),
    ...(groundGrid ? { groundGrid: { ...groundGrid, heightsM: unpackNumbers(groundGrid.heightsM) } } : {}),
  }
}

function axes(count: number): number[] {
  return Array.from({ length: count }, (_, axis) => axis)
}

export function packNumbers(values: ArrayLike<number>): PackedNumbers {
  let [low, high] = [Infinity, -Infinity]
  for (let i = 0; i < values.length; i++) {
    low = Math.min(low, values[i]!)
    high = Math.max(high, values[i]!)
  }
  const step = high > low ? (high - low) / 65_535 : 1
  const bytes = new Uint8Array(2 * values.length)
  for (let i = 0; i < values.length; i++) {
    const whole = Math.round((values[i]! - low) / step)
    bytes[2 * i] = whole & 255
    bytes[2 * i + 1] = whole >> 8
  }
  return { base64: base64Of(bytes), low: values.length > 0 ? low : 0, step }
}

export function unpackNumbers({ base64, low, step }: PackedNumbers): Float64Array {
  const bytes = bytesOf(base64)
  return new Float64Array(bytes.length / 2).map(
    (_, i) => low + step * (bytes[2 * i]! + 256 * bytes[2 * i + 1]!),
  )
}

function packBits(frames: readonly Uint8Array[]): string {
  const nodes = frames[0]!.length
  const bytes = new Uint8Array(Math.ceil((frames.length * nodes) / 8))
  for (const [frame, touches] of frames.entries()) {
    for (let node = 0; node < nodes; node++) {
      const bit = frame * nodes + node
      if (touches[node] === 1) bytes[bit >> 3] = bytes[bit >> 3]! | (1 << (bit & 7))
    }
  }
  return base64Of(bytes)
}

function unpackBits(base64: string, frames: number, nodes: number): Uint8Array[] {
  const bytes = bytesOf(base64)
  return Array.from({ length: frames }, (_, frame) =>
    new Uint8Array(nodes).map((_, node) => {
      const bit = frame * nodes + node
      return (bytes[bit >> 3]! >> (bit & 7)) & 1
    }),
  )
}

const letters = 'ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/'

/** Base64 after RFC 4648 (2006), section 4. */
export function base64Of(bytes: Uint8Array): string {
  let text = ''
  for (let i = 0; i < bytes.length; i += 3) {
    const [a, b, c] = [bytes[i]!, bytes[i + 1] ?? 0, bytes[i + 2] ?? 0]
    const known = bytes.length - i
    text += letters[a >> 2]! + letters[((a & 3) << 4) | (b >> 4)]!
    text += known > 1 ? letters[((b & 15) << 2) | (c >> 6)]! : '='
    text += known > 2 ? letters[c & 63]! : '='
  }
  return text
}

export function bytesOf(base64: string): Uint8Array {
  check(base64.length % 4 === 0, 'base64 comes in groups of four')
  const places = new Map([...letters].map((letter, place) => [letter, place]))
  const ends = base64.endsWith('==') ? 2 : base64.endsWith('=') ? 1 : 0
  const bytes = new Uint8Array((base64.length / 4) * 3 - ends)
  for (let group = 0, at = 0; group < base64.length; group += 4, at += 3) {
    const [a, b, c, d] = [0, 1, 2, 3].map((i) => places.get(base64[group + i]!) ?? 0)
    bytes[at] = (a! << 2) | (b! >> 4)
    bytes[at + 1] = ((b! & 15) << 4) | (c! >> 2)
    bytes[at + 2] = ((c! & 3) << 6) | d!
  }
  return bytes
}
