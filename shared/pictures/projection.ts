// How the world comes onto the picture: straight on in 2-D, an orthographic turntable in 3-D.
//
// The turntable turns the machine about the upright axis by `turnRad` and then tips it towards the viewer by `tiltRad`.
// With both 0 one looks along -z: x to the right, y up, z towards the viewer. Lengths across the line of sight are true.

import { cos, sin } from '../detmath/trigonometry.js'
import type { Box, Point } from './boxes.js'

export interface Camera {
  readonly turnRad: number
  /** 0: from the side; pi/2: from above. */
  readonly tiltRad: number
}

export const sideCamera: Camera = { turnRad: 0, tiltRad: 0 }
/** Where a turntable starts: a little from the right and from above, so that all three axes can be told apart. */
export const startCamera: Camera = { turnRad: -0.55, tiltRad: 0.4 }
export const tiltMostRad = Math.PI / 2

/** Unit vectors of the picture in the world: to its right, up, and out of it towards the viewer. */
export interface Axes {
  readonly right: Point
  readonly up: Point
  readonly near: Point
}

export function axesOf({ turnRad, tiltRad }: Camera): Axes {
  const [turnCos, turnSin, tiltCos, tiltSin] = [cos(turnRad), sin(turnRad), cos(tiltRad), sin(tiltRad)]
  return {
    right: [turnCos, 0, turnSin],
    up: [turnSin * tiltSin, tiltCos, -turnCos * tiltSin],
    near: [-turnSin * tiltCos, tiltSin, turnCos * tiltCos],
  }
}

export function dot(a: Point, x: number, y: number, z: number): number {
  return a[0] * x + a[1] * y + a[2] * z
}

/** Extents of a box on the picture, metres. */
export function extentsOf({ low, high }: Box, axes: Axes) {
  const along = (axis: Point) => {
    let [least, most] = [0, 0]
    for (let i = 0; i < 3; i++) {
      const [a, b] = [axis[i]! * low[i]!, axis[i]! * high[i]!]
      least += Math.min(a, b)
      most += Math.max(a, b)
    }
    return [least, most] as const
  }
  const [left, right] = along(axes.right)
  const [bottom, top] = along(axes.up)
  return { left, right, bottom, top }
}
