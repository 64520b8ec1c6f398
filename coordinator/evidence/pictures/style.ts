// The look of every picture and replay, in one place: paper and ink of a workshop drawing. Link kinds differ by width and dash
// first and by colour second, so that print, photocopy and colour-blind eyes lose nothing. All inks have at least 3:1
// contrast against their paper (tested), text 4.5:1.

export interface Theme {
  readonly paper: string
  readonly ink: string
  /** Text of lesser weight. */
  readonly faint: string
  readonly ground: string
  readonly groundFill: string
  readonly marker: string
  readonly path: string
  readonly caution: string
  readonly cautionFill: string
  /** For links without drive, by kind in order of appearance. */
  readonly passive: readonly string[]
  /** For driven links, by kind in order of appearance. */
  readonly active: readonly string[]
}

export const light: Theme = {
  paper: '#fbfaf5',
  ink: '#1d2a2f',
  faint: '#55646b',
  ground: '#5d6b52',
  groundFill: '#e4e3d3',
  marker: '#8a3324',
  path: '#a0522d',
  caution: '#6b3d00',
  cautionFill: '#fff1d6',
  passive: ['#1d2a2f', '#4f5d66', '#6c6a58'],
  active: ['#00609c', '#b34700', '#00755a', '#8f3f75', '#5a4a00'],
}

export const dark: Theme = {
  paper: '#14191c',
  ink: '#e8e6dc',
  faint: '#a9b3b5',
  ground: '#8d9a80',
  groundFill: '#232a27',
  marker: '#f0a08c',
  path: '#d9a066',
  caution: '#ffd9a0',
  cautionFill: '#33280f',
  passive: ['#e8e6dc', '#b4bec2', '#a8a48c'],
  active: ['#6db8ef', '#ff9a57', '#4fd0a8', '#e39ccb', '#e0c94a'],
}

/** Dash patterns by kind in order of appearance, in units of the line's width. */
export const dashes: readonly (readonly number[])[] = [[], [4, 1.5], [1.2, 1.4], [6, 1.5, 1.2, 1.5]]

export const passiveWidth = 2
export const activeWidth = 4.5
export const fontFamily = "'Noto Sans', 'DejaVu Sans', 'Liberation Sans', Arial, sans-serif"

export interface LinkStyle {
  readonly kind: string
  readonly isActive: boolean
  /** Place in the theme's colours. */
  readonly colour: number
  readonly dash: readonly number[]
  readonly width: number
}

/** The style of each kind; `isActive` says which kinds are driven. Kinds keep their order. */
export function linkStyles(
  kinds: readonly { readonly kind: string; readonly isActive: boolean }[],
): LinkStyle[] {
  const seen = { passive: 0, active: 0 }
  return kinds.map(({ kind, isActive }) => {
    const group = isActive ? 'active' : 'passive'
    const place = seen[group]++
    const colours = light[group].length
    return {
      kind,
      isActive,
      colour: place % colours,
      dash: dashes[isActive ? Math.floor(place / colours) % dashes.length : place % dashes.length]!,
      width: isActive ? activeWidth : passiveWidth,
    }
  })
}

export function colourOf(theme: Theme, style: LinkStyle): string {
  return (style.isActive ? theme.active : theme.passive)[style.colour]!
}
