// Heights of the ground at any place, as the simulators define them between their points: straight lines along a
// profile, bilinear patches on a grid, level beyond the ends.

import type { FrameGroundGrid, Frames } from '../frames.js'

export type GroundHeight = (x: number, z: number) => number

/** Undefined where there is no ground to draw. */
export function groundHeight({ ground, groundGrid }: Frames): GroundHeight | undefined {
  if (groundGrid !== undefined) return (x, z) => gridHeight(groundGrid, x, z)
  if (ground.length === 0) return undefined
  return (x) => profileHeight(ground, x)
}

function profileHeight(line: Frames['ground'], x: number): number {
  let [low, high] = [0, line.length - 1]
  if (x <= line[low]![0]) return line[low]![1]
  if (x >= line[high]![0]) return line[high]![1]
  while (high - low > 1) {
    const middle = (low + high) >> 1
    if (line[middle]![0] <= x) low = middle
    else high = middle
  }
  const [left, right] = [line[low]!, line[high]!]
  const share = right[0] > left[0] ? (x - left[0]) / (right[0] - left[0]) : 0
  return left[1] + share * (right[1] - left[1])
}

function gridHeight(grid: FrameGroundGrid, x: number, z: number): number {
  const { countX, countZ, heightsM } = grid
  const atX = Math.min(countX - 1, Math.max(0, (x - grid.firstXM) / grid.spacingXM))
  const atZ = Math.min(countZ - 1, Math.max(0, (z - grid.firstZM) / grid.spacingZM))
  const [i, k] = [Math.min(countX - 2, Math.floor(atX)), Math.min(countZ - 2, Math.floor(atZ))]
  const [shareX, shareZ] = [atX - i, atZ - k]
  const at = (across: number, along: number) => heightsM[countX * across + along]!
  const near = at(k, i) + shareX * (at(k, i + 1) - at(k, i))
  const far = at(k + 1, i) + shareX * (at(k + 1, i + 1) - at(k + 1, i))
  return near + shareZ * (far - near)
}
