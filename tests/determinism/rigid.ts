// Golden rigid bodies in space: a heap of boxes that falls on a floor. (Those in the plane: the screen rake.)

import { stream } from '../../shared/streams.js'
import { withRigid } from '../../sim/rigid/rigid3d.js'
import { box, fixed, g, pass } from '../reference/rigid-bodies.js'

const seed = 20_261_209

export function heapNumbers(): number[] {
  const draw = stream(seed, 'spare', 4)
  const between = (low: number, high: number) => low + draw.uniform() * (high - low)
  const boxes = Array.from({ length: 12 }, (_, i) => ({
    name: `box ${i}`,
    positionM: [between(-0.1, 0.1), 0.2 + 0.25 * i, between(-0.1, 0.1)],
    turn: [0, 0, 0, 1],
    shapes: [box([between(0.05, 0.12), between(0.05, 0.12), between(0.05, 0.12)], { friction: 0.5 })],
  }))
  const floor = fixed('floor', [box([5, 0.5, 5], { friction: 0.5 })], [0, -0.5, 0])
  const spec = { gravityMps2: [0, -g, 0], stepSeconds: 1 / 120, bodies: [floor, ...boxes] }
  return withRigid(spec, (world) => {
    pass(world, 1.5)
    return boxes.flatMap((_, i) => [...world.pose(i + 1), ...world.velocity(i + 1)])
  })
}
