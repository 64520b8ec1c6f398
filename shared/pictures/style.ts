// The look of every picture and replay: inks by what they stand for, line weights and dashes. Paper and ink of a workshop
// drawing. What matters is told by shape, weight or dash first and by colour second, so that print, photocopy and
// colour-blind eyes lose nothing.
//
// Held by tests: text has a contrast of at least 4.5:1 and lines of 3:1 against their paper (WCAG 2.2); the inks of
// actuator groups stay apart for the three kinds of dichromats.

/** What a colour stands for; a theme says what it is. */
export type Ink =
  | 'paper'
  | 'ink'
  | 'faint'
  | 'ground'
  | 'groundFill'
  | 'grid'
  | 'shadow'
  | 'wall'
  | 'marker'
  | 'way'
  | 'bodyFill'
  | 'load'
  | 'loadFill'
  | 'contact'
  | 'caution'
  | 'cautionFill'
  | ActiveInk
export type ActiveInk = 'active1' | 'active2' | 'active3' | 'active4' | 'active5'
export type Theme = { readonly [ink in Ink]: string }

export const activeInks: readonly ActiveInk[] = ['active1', 'active2', 'active3', 'active4', 'active5']

export const light: Theme = {
  paper: '#fbfaf5',
  ink: '#1d2a2f',
  faint: '#55646b',
  ground: '#5d6b52',
  groundFill: '#e4e3d3',
  grid: '#b9b8a4',
  shadow: '#7f8272',
  wall: '#6b5f50',
  marker: '#8a3324',
  way: '#a0522d',
  bodyFill: '#dfe5e4',
  load: '#6a5a1e',
  loadFill: '#efe3bd',
  contact: '#1d2a2f',
  caution: '#6b3d00',
  cautionFill: '#fff1d6',
  active1: '#1f3fb0',
  active2: '#bd6414',
  active3: '#2a8a6a',
  active4: '#9460ac',
  active5: '#3a2a00',
}

export const dark: Theme = {
  paper: '#14191c',
  ink: '#e8e6dc',
  faint: '#a9b3b5',
  ground: '#8d9a80',
  groundFill: '#232a27',
  grid: '#3d4743',
  shadow: '#69756e',
  wall: '#a39682',
  marker: '#f0a08c',
  way: '#d9a066',
  bodyFill: '#2c373b',
  load: '#cdb765',
  loadFill: '#3a3418',
  contact: '#e8e6dc',
  caution: '#ffd9a0',
  cautionFill: '#33280f',
  active1: '#6a86ff',
  active2: '#de6a2c',
  active3: '#66f0b4',
  active4: '#b07eae',
  active5: '#f0e43c',
}

export const fontFamily = "'Noto Sans', 'DejaVu Sans', 'Liberation Sans', Arial, sans-serif"

/** Dash patterns in units of the line's width; the first is a solid line. */
export const dashes: readonly (readonly number[])[] = [[], [4, 1.8], [1.3, 1.5], [6, 1.6, 1.3, 1.6]]

/** Line weight of the softest and the stiffest passive strut, and of one whose stiffness class is not known. */
export const softestWidthPx = 1.2
export const stiffestWidthPx = 4.8
export const unknownWidthPx = 2
/** Actuators are sleeves: two rails this far apart, of this weight. */
export const sleeveWidthPx = 7.5
export const railWidthPx = 1.7
