// What a problem hands over to be looked at: where everything was, frame by frame, and what it is. Types only; drawn by
// shared/pictures/. SI units; x along the ground, y up, z across (3-D only, towards the viewer at the start).
//
// Everything behind a question mark may be left out: then it is not drawn and the legend does not speak of it.

/** What a replay shows: node positions over time, the links between nodes and what they are. SI units. */
export interface Frames {
  readonly dimensions: 2 | 3
  readonly secondsPerFrame: number
  /** Each frame: x0, y0[, z0], x1, ... in metres. A machine of bodies alone has empty frames. */
  readonly positions: readonly Float64Array[]
  readonly links: readonly FrameLink[]
  readonly nodeRadiiM: readonly number[]
  /** Outline of the ground as points x, y in metres, left to right; the same at every z. */
  readonly ground: readonly (readonly [number, number])[]
  /** Carried things to draw, e.g. the puck: follows a node. */
  readonly markers: readonly { readonly node: number; readonly label: string; readonly radiusM: number }[]
  /** Drive of each active link per frame, -1 (shortest) to 1 (longest); links without drive are absent. */
  readonly drive: readonly { readonly link: number; readonly values: Float64Array }[]
  /** Each frame: one byte a node, 1 where it touches something, else 0. */
  readonly contacts?: readonly Uint8Array[]
  /** Rigid pieces, each of which moves as a whole. */
  readonly bodies?: readonly FrameBody[]
  /** Driven joints at nodes. */
  readonly motors?: readonly FrameMotor[]
  /** What stands still beside the ground: a pipe's wall, a screen, a stop. Always drawn. */
  readonly walls?: readonly FrameWall[]
  /** Ground that differs across, 3-D only; drawn instead of `ground`. */
  readonly groundGrid?: FrameGroundGrid
  /** Words at places that stand still. */
  readonly labels?: readonly { readonly text: string; readonly atM: readonly number[] }[]
  /** A sentence that must stand in every picture, such as 'motion drawn 60 times larger'. */
  readonly note?: string
  /** The part of the world worth showing, where that is not the way of the machine; corners x, y[, z]. */
  readonly worthSeeing?: { readonly lowM: readonly number[]; readonly highM: readonly number[] }
}

export interface FrameLink {
  readonly a: number
  readonly b: number
  /** Short word such as 'soft', 'stiff', 'actuator 1'; used for the legend. */
  readonly kind: string
  /** Stiffness class from 0 (softest) to 1 (stiffest), drawn as line weight; the same for all links of a kind. */
  readonly weight?: number
}

export interface FrameMotor {
  readonly node: number
  readonly label: string
  /** Drive of each frame: -1 (clockwise) to 1 (counter-clockwise), or -1 (in) to 1 (out) of a slide. */
  readonly values: Float64Array
  /** A slide, which goes away from this node when it is driven out. */
  readonly slidesFrom?: number
}

/** A rigid piece: corners in axes of its own, and where those axes are in each frame. */
export interface FrameBody {
  /** What it is, for the legend: 'crank', 'leaf litter'. Bodies of one label look alike. */
  readonly label: string
  /** 'machine': part of what was evolved; 'load': what it moves. */
  readonly role: 'machine' | 'load'
  /** x0, y0[, z0], x1, ... in metres, in its own axes. */
  readonly cornersM: readonly number[]
  /** Rounds the corners: one corner makes a disc or ball, two a rod with round ends. 0 unless said. */
  readonly radiusM?: number
  /** Loops of corner numbers: the faces of a solid. All corners in order make one outline unless said. */
  readonly faces?: readonly (readonly number[])[]
  /** Each frame: x, y, angle in radians (2-D), or x, y, z and the unit quaternion qx, qy, qz, qw (3-D). */
  readonly poses: readonly Float64Array[]
}

export interface FrameWall {
  /** 'pipe wall', 'screen bar'. Walls of one label have one row in the legend. */
  readonly label: string
  /** A line through x0, y0[, z0], x1, ... in metres. */
  readonly pointsM: readonly number[]
  /** In 2-D, on which side of the line the solid is, going from its first point; hatched there. */
  readonly solid?: 'left' | 'right'
}

/** Heights at the crossings of a grid, row by row: heightsM[countX * k + i] at firstXM + i spacingXM, firstZM + k spacingZM. */
export interface FrameGroundGrid {
  readonly firstXM: number
  readonly firstZM: number
  readonly spacingXM: number
  readonly spacingZM: number
  readonly countX: number
  readonly countZ: number
  readonly heightsM: Float64Array
}
