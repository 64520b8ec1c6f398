// The replay of one walk, in the world: the ramp falls to the right. Three nodes: hip, stance foot, swing foot; at a
// heel strike the feet change their roles where they are.

import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import type { Frames } from '../../../shared/problem.js'
import { endStep, startStep } from './model.js'
import { numbers, timeSeconds } from './numbers.js'
import type { Release } from './release.js'
import { type Ramp, walk } from './walk.js'

const framesPerSecond = 25

/** Where the stance foot is, and the ramp under it. */
interface Footing {
  readonly xM: number
  readonly yM: number
  readonly gamma: number
}

/** Frames from the release to the end of the walk; a fall is shown until the stance leg carries nothing. */
export function walkerFrames({ stance, gamma }: Release, ramp: Ramp): Frames {
  const { starts, slopes, taken, fall } = walk(stance, gamma, ramp)
  const positions: Float64Array[] = []
  const ground: [number, number][] = [along({ xM: 0, yM: 0, gamma }, -1.5 * numbers.legM)]
  const perFrame = 1 / framesPerSecond / timeSeconds
  let foot: Footing = { xM: 0, yM: 0, gamma }
  // From the start of a step to its first frame.
  let due = 0
  for (const [i, start] of starts.entries()) {
    const slope = slopes[i]!
    const period = taken[i]?.period ?? fall!.period
    foot = { ...foot, gamma: slope }
    ground.push([foot.xM, foot.yM])
    // Each frame from the step's start: the walk itself is not cut into other pieces than when it was simulated.
    for (; due < period; due += perFrame) {
      const motion = startStep(start, slope, numbers.step)
      endStep(motion, slope, due)
      positions.push(placesM(foot, motion.state))
    }
    due -= period
    const end = taken[i]
    if (!end) break
    const [xM, yM] = along(foot, 2 * numbers.legM * sin(end.next.theta))
    foot = { xM, yM, gamma: slope }
  }
  ground.push(along(foot, 2 * numbers.legM))
  return {
    dimensions: 2,
    secondsPerFrame: 1 / framesPerSecond,
    positions,
    links: [
      { a: 0, b: 1, kind: 'stance leg', weight: 1 },
      { a: 0, b: 2, kind: 'swing leg', weight: 0.5 },
    ],
    nodeRadiiM: [0.04, 0.012, 0.012],
    ground,
    markers: [{ node: 0, label: 'hip with lamp and camera', radiusM: 0.06 }],
    drive: [],
    contacts: positions.map(() => Uint8Array.of(0, 1, 0)),
  }
}

/** A place on the ramp, `distanceM` down from the foot. */
function along({ xM, yM, gamma }: Footing, distanceM: number): [number, number] {
  return [xM + distanceM * cos(gamma), yM - distanceM * sin(gamma)]
}

function placesM(foot: Footing, state: Float64Array): Float64Array {
  const { legM } = numbers
  // Angles are counted from the ramp's normal, which leans down the ramp by its slope.
  const stance = state[0]! - foot.gamma
  const swing = stance - state[2]!
  const hipX = foot.xM - legM * sin(stance)
  const hipY = foot.yM + legM * cos(stance)
  return Float64Array.of(hipX, hipY, foot.xM, foot.yM, hipX + legM * sin(swing), hipY - legM * cos(swing))
}
