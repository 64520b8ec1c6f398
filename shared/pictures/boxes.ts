// Boxes along the axes of the world, and how large they are for a camera. Metres; z is 0 in 2-D.

export type Point = readonly [number, number, number]
export interface Box {
  readonly low: Point
  readonly high: Point
}

/** Grows around points; `box()` is undefined while it has seen none. */
export class BoxMaker {
  private readonly low = [Infinity, Infinity, Infinity]
  private readonly high = [-Infinity, -Infinity, -Infinity]

  add(x: number, y: number, z: number, radiusM = 0): void {
    const point = [x, y, z]
    for (let axis = 0; axis < 3; axis++) {
      this.low[axis] = Math.min(this.low[axis]!, point[axis]! - radiusM)
      this.high[axis] = Math.max(this.high[axis]!, point[axis]! + radiusM)
    }
  }

  addBox({ low, high }: Box): void {
    this.add(...low)
    this.add(...high)
  }

  box(): Box | undefined {
    const [low, high] = [this.low, this.high]
    if (!(low[0]! <= high[0]!)) return undefined
    return { low: [low[0]!, low[1]!, low[2]!], high: [high[0]!, high[1]!, high[2]!] }
  }
}

export function moved({ low, high }: Box, by: Point): Box {
  return {
    low: [low[0] + by[0], low[1] + by[1], low[2] + by[2]],
    high: [high[0] + by[0], high[1] + by[1], high[2] + by[2]],
  }
}

/** The longest side. */
export function sizeOf({ low, high }: Box): number {
  return Math.max(high[0] - low[0], high[1] - low[1], high[2] - low[2])
}

export function middleOf({ low, high }: Box): Point {
  return [(low[0] + high[0]) / 2, (low[1] + high[1]) / 2, (low[2] + high[2]) / 2]
}
