// Pareto: who dominates whom, fronts, crowding, and the volume a front dominates. Every objective is minimised;
// a failed individual may score +Infinity. A point is one number an objective; NaN is a broken promise.
//
// Equal points do not dominate each other: they share a front. Every order is total: ties go to the lower index.

import { check } from '../../shared/check.js'

export type Point = ArrayLike<number>

/** True when `a` is nowhere worse than `b` and somewhere better. */
export function dominates(a: Point, b: Point): boolean {
  let better = false
  for (let m = 0; m < a.length; m++) {
    if (a[m]! > b[m]!) return false
    if (a[m]! < b[m]!) better = true
  }
  return better
}

/**
 * Fronts of non-dominated points, best front first, each as ascending indices into `points`.
 * Two objectives: one sorted sweep with a binary search over the fronts, O(N log N) (Jensen, Reducing the
 * run-time complexity of multiobjective EAs, 2003). Otherwise the counting sort of Deb, Pratap, Agarwal and
 * Meyarivan, A fast and elitist multiobjective genetic algorithm: NSGA-II, 2002, O(M N^2).
 */
export function nonDominatedFronts(points: readonly Point[]): number[][] {
  checkPoints(points)
  if (points.length === 0) return []
  return points[0]!.length === 2 ? frontsOfTwo(points) : frontsByCounting(points)
}

/** The front of each point, 0 for the non-dominated ones. */
export function frontRanks(points: readonly Point[]): Int32Array {
  const ranks = new Int32Array(points.length)
  nonDominatedFronts(points).forEach((front, rank) => {
    for (const index of front) ranks[index] = rank
  })
  return ranks
}

function frontsOfTwo(points: readonly Point[]): number[][] {
  const order = points.map((_, index) => index)
  order.sort(
    (i, j) => compare(points[i]![0]!, points[j]![0]!) || compare(points[i]![1]!, points[j]![1]!) || i - j,
  )
  const fronts: number[][] = []
  // Points come in order of the first objective, so within a front the last one has the lowest second objective:
  // a front dominates the next point if and only if its last one does. A front that does not dominate it cannot
  // be followed by one that does.
  for (const index of order) {
    let low = 0
    let high = fronts.length
    while (low < high) {
      const middle = (low + high) >>> 1
      const front = fronts[middle]!
      if (dominates(points[front[front.length - 1]!]!, points[index]!)) low = middle + 1
      else high = middle
    }
    if (low === fronts.length) fronts.push([index])
    else fronts[low]!.push(index)
  }
  for (const front of fronts) front.sort((i, j) => i - j)
  return fronts
}

function frontsByCounting(points: readonly Point[]): number[][] {
  const dominators = new Int32Array(points.length)
  const dominated: number[][] = points.map(() => [])
  for (let i = 0; i < points.length; i++) {
    for (let j = i + 1; j < points.length; j++) {
      if (dominates(points[i]!, points[j]!)) {
        dominated[i]!.push(j)
        dominators[j]!++
      } else if (dominates(points[j]!, points[i]!)) {
        dominated[j]!.push(i)
        dominators[i]!++
      }
    }
  }
  const fronts: number[][] = []
  let front = points.map((_, index) => index).filter((index) => dominators[index] === 0)
  while (front.length > 0) {
    fronts.push(front)
    const next: number[] = []
    for (const i of front) {
      for (const j of dominated[i]!) if (--dominators[j]! === 0) next.push(j)
    }
    front = next.sort((i, j) => i - j)
  }
  return fronts
}

/**
 * Crowding distance of the points of one front (Deb et al. 2002, as nonDominatedFronts), in the order of `front`:
 * the sum over objectives of the gap between the two neighbours over the front's span. The ends of every
 * objective with a span get Infinity, and so do both points of a front of one or two. An objective in which all
 * are equal says nothing and adds nothing. Infinite scores are left out of the span; a point between a finite
 * and an infinite neighbour counts as an end.
 */
export function crowdingDistance(points: readonly Point[], front: readonly number[]): Float64Array {
  const distance = new Float64Array(front.length)
  if (front.length <= 2) return distance.fill(Number.POSITIVE_INFINITY)
  const objectives = points[front[0]!]!.length
  for (let m = 0; m < objectives; m++) addCrowding(points, front, m, distance)
  return distance
}

function addCrowding(
  points: readonly Point[],
  front: readonly number[],
  m: number,
  distance: Float64Array,
): void {
  const value = (position: number): number => points[front[position]!]![m]!
  const order = front.map((_, position) => position)
  order.sort((i, j) => compare(value(i), value(j)) || front[i]! - front[j]!)
  const last = order.length - 1
  if (value(order[0]!) === value(order[last]!)) return
  let highest = last
  while (value(order[highest]!) === Number.POSITIVE_INFINITY) highest--
  const span = value(order[highest]!) - value(order[0]!)
  distance[order[0]!] = Number.POSITIVE_INFINITY
  distance[order[last]!] = Number.POSITIVE_INFINITY
  for (let k = 1; k < last; k++) {
    const below = value(order[k - 1]!)
    const above = value(order[k + 1]!)
    if (below === above) continue
    distance[order[k]!]! += above === Number.POSITIVE_INFINITY ? above : (above - below) / span
  }
}

/**
 * The volume dominated by `points` within the box that ends at `reference`, exactly up to rounding; points that
 * are not better than the reference in every objective add nothing. One to three objectives by sweeps; more by
 * exclusive volumes of limited sets (While, Bradstreet and Barone, A fast way of calculating exact hypervolumes,
 * 2012).
 */
export function hypervolume(points: readonly Point[], reference: Point): number {
  checkPoints(points)
  const inside: Point[] = []
  for (const point of points) {
    check(point.length === reference.length, 'points and reference have the same objectives')
    let within = true
    for (let m = 0; m < reference.length; m++) if (!(point[m]! < reference[m]!)) within = false
    if (within) inside.push(point)
  }
  return volumeOf(inside, reference)
}

function volumeOf(points: readonly Point[], reference: Point): number {
  if (points.length === 0) return 0
  if (points.length === 1) return boxVolume(points[0]!, reference)
  if (reference.length === 1) return reference[0]! - points.reduce((low, p) => Math.min(low, p[0]!), Infinity)
  if (reference.length === 2) return areaOf(points, reference)
  if (reference.length === 3) return volumeOfThree(points, reference)
  return volumeByExclusion(points, reference)
}

function boxVolume(point: Point, reference: Point): number {
  let volume = 1
  for (let m = 0; m < reference.length; m++) volume *= reference[m]! - point[m]!
  return volume
}

/** Two objectives: strips between the steps of the staircase. */
function areaOf(points: readonly Point[], reference: Point): number {
  const sorted = [...points].sort((a, b) => compare(a[0]!, b[0]!) || compare(a[1]!, b[1]!))
  let area = 0
  let ceiling = reference[1]!
  for (const point of sorted) {
    if (point[1]! >= ceiling) continue
    area += (reference[0]! - point[0]!) * (ceiling - point[1]!)
    ceiling = point[1]!
  }
  return area
}

/**
 * Three objectives: slices between successive values of the third one. The staircase of the first two is kept
 * sorted (first ascending, second descending) with its area, so that a point costs one insertion.
 */
function volumeOfThree(points: readonly Point[], reference: Point): number {
  const sorted = [...points].sort(
    (a, b) => compare(a[2]!, b[2]!) || compare(a[0]!, b[0]!) || compare(a[1]!, b[1]!),
  )
  const stairs: Point[] = []
  let area = 0
  let volume = 0
  for (let k = 0; k < sorted.length; k++) {
    area += insertStair(stairs, sorted[k]!, reference)
    const ceiling = k + 1 < sorted.length ? sorted[k + 1]![2]! : reference[2]!
    volume += area * (ceiling - sorted[k]![2]!)
  }
  return volume
}

/** Puts a point into the staircase, removes those it covers, and returns the area it adds. */
function insertStair(stairs: Point[], point: Point, reference: Point): number {
  let at = 0
  while (at < stairs.length && stairs[at]![0]! <= point[0]!) at++
  let ceiling = at > 0 ? stairs[at - 1]![1]! : reference[1]!
  if (ceiling <= point[1]!) return 0
  let added = 0
  let left = point[0]!
  let end = at
  while (end < stairs.length && stairs[end]![1]! >= point[1]!) {
    added += (stairs[end]![0]! - left) * (ceiling - point[1]!)
    left = stairs[end]![0]!
    ceiling = stairs[end]![1]!
    end++
  }
  const right = end < stairs.length ? stairs[end]![0]! : reference[0]!
  added += (right - left) * (ceiling - point[1]!)
  // A step before `at` with the same first objective is covered too; it has no width and does no harm.
  stairs.splice(at, end - at, point)
  return added
}

/**
 * More objectives: the sum of what each point dominates and none of the later ones does. Worst in the last
 * objective first, so that limiting the later points to this one makes them all equal there: that objective
 * becomes a factor and drops out.
 */
function volumeByExclusion(points: readonly Point[], reference: Point): number {
  const last = reference.length - 1
  const sorted = [...points].sort((a, b) => compare(b[last]!, a[last]!))
  const shorter = Float64Array.from(reference).subarray(0, last)
  let volume = 0
  for (let k = 0; k < sorted.length; k++) {
    const point = sorted[k]!
    const limited: Point[] = []
    for (let j = k + 1; j < sorted.length; j++) limited.push(limitedTo(point, sorted[j]!, last))
    const covered = volumeOf(withoutDominated(limited), shorter)
    volume += (reference[last]! - point[last]!) * (boxVolume(point, shorter) - covered)
  }
  return volume
}

/** The part of `other` within the box of `point`, in the first `objectives` objectives. */
function limitedTo(point: Point, other: Point, objectives: number): Float64Array {
  const limited = new Float64Array(objectives)
  for (let m = 0; m < objectives; m++) limited[m] = Math.max(point[m]!, other[m]!)
  return limited
}

/** The non-dominated points, one of each. */
function withoutDominated(points: readonly Point[]): Point[] {
  const kept: Point[] = []
  for (const point of points) {
    if (kept.some((other) => weaklyDominates(other, point))) continue
    let size = 0
    for (const other of kept) if (!weaklyDominates(point, other)) kept[size++] = other
    kept.length = size
    kept.push(point)
  }
  return kept
}

function weaklyDominates(a: Point, b: Point): boolean {
  for (let m = 0; m < a.length; m++) if (a[m]! > b[m]!) return false
  return true
}

/** By difference would be NaN for two infinities. */
function compare(a: number, b: number): number {
  return a < b ? -1 : a > b ? 1 : 0
}

function checkPoints(points: readonly Point[]): void {
  for (const point of points) {
    check(point.length === points[0]!.length && point.length > 0, 'points have the same objectives')
    for (let m = 0; m < point.length; m++) check(!Number.isNaN(point[m]), 'no score is NaN')
  }
}
