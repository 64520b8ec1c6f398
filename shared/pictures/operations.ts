// The display list: what a drawing consists of, in pixels, before anybody paints it. Stills (paint-svg.ts) and motion
// (paint-canvas.ts) paint the same list, so they cannot differ in anything but the medium.
//
// Colours are inks (style.ts); a theme turns them into colours when painted. y runs downwards.

import type { Ink } from './style.js'

/** What an operation stands for. Nothing is painted by role; tests, legends and readers of the list use it. */
export type Role =
  | 'actuator'
  | 'axis'
  | 'body'
  | 'contact'
  | 'ground'
  | 'halo'
  | 'hatch'
  | 'label'
  | 'load'
  | 'marker'
  | 'motor'
  | 'node'
  | 'note'
  | 'plate'
  | 'scale'
  | 'shadow'
  | 'strip'
  | 'strut'
  | 'text'
  | 'time'
  | 'wall'
  | 'way'

export interface Look {
  readonly fill?: Ink
  readonly fillOpacity?: number
  readonly stroke?: Ink
  readonly strokeOpacity?: number
  /** 1 unless said. */
  readonly widthPx?: number
  readonly dashPx?: readonly number[]
  /** Round ends and corners; else ends are cut straight. */
  readonly isRound?: boolean
}

/** Lines through points x0, y0, x1, ... */
export interface Lines extends Look {
  readonly shape: 'lines'
  readonly role: Role
  readonly lines: readonly (readonly number[])[]
  readonly isClosed?: boolean
}

/** Discs x0, y0, r0, x1, ... */
export interface Discs extends Look {
  readonly shape: 'discs'
  readonly role: Role
  readonly discs: readonly number[]
}

export interface Words {
  readonly shape: 'words'
  readonly role: Role
  readonly text: string
  readonly x: number
  /** The baseline. */
  readonly y: number
  readonly sizePx: number
  readonly ink: Ink
  readonly anchor: 'start' | 'middle' | 'end'
  readonly isBold?: boolean
  /** Paper around the letters, so that they can be read over lines. */
  readonly hasHalo?: boolean
}

export type Operation = Lines | Discs | Words

/** About how wide a text of ordinary letters is: 0.56 of its size a letter (measured on the fonts named in style.ts). */
export function textWidthPx(text: string, sizePx: number): number {
  return 0.56 * sizePx * text.length
}
