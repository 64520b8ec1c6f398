// The inks by the numbers: contrast, and what dichromats see of them.

import { describe, expect, it } from 'vitest'
import { kindLooks } from './looks.js'
import { activeInks, dark, type Ink, light, type Theme } from './style.js'

type Triple = readonly [number, number, number]

/** Linear red, green and blue of an sRGB colour (IEC 61966-2-1, 1999; threshold as in WCAG 2.2). */
function linear(colour: string): Triple {
  const [r, g, b] = [1, 3, 5].map((at) => {
    const part = Number.parseInt(colour.slice(at, at + 2), 16) / 255
    return part <= 0.04045 ? part / 12.92 : ((part + 0.055) / 1.055) ** 2.4
  })
  return [r!, g!, b!]
}

/** Relative luminance and contrast ratio: Web Content Accessibility Guidelines 2.2 (W3C, 2023), definitions. */
function contrast(a: string, b: string): number {
  const luminance = (colour: string) => {
    const [r, g, blue] = linear(colour)
    return 0.2126 * r + 0.7152 * g + 0.0722 * blue
  }
  const [high, low] = [luminance(a), luminance(b)].sort((x, y) => y - x)
  return (high! + 0.05) / (low! + 0.05)
}

// Severity 1.0, on linear RGB. Machado, Oliveira and Fernandes, A physiologically-based model for simulation of color
// vision deficiency, 2009 (from memory; each row sums to 1, so greys stay).
const seenBy: { readonly [who: string]: readonly Triple[] } = {
  everybody: [
    [1, 0, 0],
    [0, 1, 0],
    [0, 0, 1],
  ],
  protanopes: [
    [0.152286, 1.052583, -0.204868],
    [0.114503, 0.786281, 0.099216],
    [-0.003882, -0.048116, 1.051998],
  ],
  deuteranopes: [
    [0.367322, 0.860646, -0.227968],
    [0.280085, 0.672501, 0.047413],
    [-0.01182, 0.04294, 0.968881],
  ],
  tritanopes: [
    [1.255528, -0.076749, -0.178779],
    [-0.078411, 0.930809, 0.147602],
    [0.004733, 0.691367, 0.3039],
  ],
}

function seen([r, g, b]: Triple, matrix: readonly Triple[]): Triple {
  const [x, y, z] = matrix.map(([a, c, d]) => Math.min(1, Math.max(0, a * r + c * g + d * b)))
  return [x!, y!, z!]
}

/** CIE 1976 L*a*b* under D65, and the distance of two colours in it (CIE 15, Colorimetry). */
function lab([r, g, b]: Triple): Triple {
  const f = (t: number) => (t > (6 / 29) ** 3 ? Math.cbrt(t) : t / (3 * (6 / 29) ** 2) + 4 / 29)
  const x = f((0.4124 * r + 0.3576 * g + 0.1805 * b) / 0.9505)
  const y = f(0.2126 * r + 0.7152 * g + 0.0722 * b)
  const z = f((0.0193 * r + 0.1192 * g + 0.9505 * b) / 1.089)
  return [116 * y - 16, 500 * (x - y), 200 * (y - z)]
}
const apart = (a: Triple, b: Triple) => Math.hypot(a[0] - b[0], a[1] - b[1], a[2] - b[2])

describe('the formulas of this file', () => {
  it('give the extremes that their sources state', () => {
    expect(contrast('#000000', '#ffffff')).toBeCloseTo(21, 10)
    expect(lab(linear('#ffffff'))[0]).toBeCloseTo(100, 6)
    for (const matrix of Object.values(seenBy))
      for (const row of matrix) expect(row[0] + row[1] + row[2]).toBeCloseTo(1, 5)
    // Red and green of one lightness: what the matrices are for.
    const [red, green] = [linear('#c04040'), linear('#5f7a35')]
    const distance = (who: string) => apart(lab(seen(red, seenBy[who]!)), lab(seen(green, seenBy[who]!)))
    expect(distance('deuteranopes')).toBeLessThan(0.5 * distance('everybody'))
  })
})

const text: readonly Ink[] = ['ink', 'faint']
const lines: readonly Ink[] = [
  'ink',
  'faint',
  'ground',
  'wall',
  'marker',
  'way',
  'load',
  'contact',
  'shadow',
  ...activeInks,
]
/** What is drawn over the ground's fill. */
const overGround: readonly Ink[] = ['ink', 'contact', 'ground', 'marker', ...activeInks]

describe.each(Object.entries({ light, dark }) as [string, Theme][])('the %s theme', (_, theme) => {
  it('has 4.5:1 for text and 3:1 for lines (WCAG 2.2, criteria 1.4.3 and 1.4.11)', () => {
    for (const ink of text) {
      expect(contrast(theme[ink], theme.paper), ink).toBeGreaterThanOrEqual(4.5)
      expect(contrast(theme[ink], theme.groundFill), ink).toBeGreaterThanOrEqual(4.5)
    }
    expect(contrast(theme.caution, theme.cautionFill)).toBeGreaterThanOrEqual(4.5)
    for (const ink of lines) expect(contrast(theme[ink], theme.paper), ink).toBeGreaterThanOrEqual(3)
    for (const ink of overGround)
      expect(contrast(theme[ink], theme.groundFill), ink).toBeGreaterThanOrEqual(3)
    expect(contrast(theme.ink, theme.bodyFill)).toBeGreaterThanOrEqual(3)
    expect(contrast(theme.load, theme.loadFill)).toBeGreaterThanOrEqual(3)
  })
  it.each(Object.keys(seenBy))('keeps the inks of actuator groups apart for %s', (who) => {
    // 2.3 in L*a*b* is about the least difference that one sees side by side (Mahy, Van Eycken and Oosterlinck, 1994);
    // ten times that is told apart at a glance in thin lines (common practice, no source).
    const colours = activeInks.map((ink) => lab(seen(linear(theme[ink]), seenBy[who]!)))
    for (let i = 0; i < colours.length; i++)
      for (let j = 0; j < i; j++) expect(apart(colours[i]!, colours[j]!)).toBeGreaterThan(23)
  })
})

describe('looks of kinds', () => {
  const frames = (kinds: readonly { kind: string; weight?: number; isDriven?: boolean }[]) =>
    ({
      dimensions: 2,
      secondsPerFrame: 1,
      positions: [Float64Array.of(0, 0, 1, 0)],
      links: kinds.map(({ kind, weight }) => ({
        a: 0,
        b: 1,
        kind,
        ...(weight === undefined ? {} : { weight }),
      })),
      nodeRadiiM: [0, 0],
      ground: [],
      markers: [],
      drive: kinds.flatMap(({ isDriven }, link) => (isDriven ? [{ link, values: Float64Array.of(0) }] : [])),
    }) as const

  it('give stiffer classes bolder lines, in that order', () => {
    const looks = kindLooks(
      frames([
        { kind: 'hard', weight: 1 },
        { kind: 'soft', weight: 0 },
        { kind: 'firm', weight: 0.5 },
      ]),
    )
    expect(looks.map(({ kind }) => kind)).toEqual(['soft', 'firm', 'hard'])
    expect(looks[1]!.widthPx).toBeGreaterThan(1.5 * looks[0]!.widthPx)
    expect(looks[2]!.widthPx).toBeGreaterThan(1.5 * looks[1]!.widthPx)
  })
  it('tell kinds of one weight, or without a class, apart by their dashes', () => {
    for (const weight of [undefined, 0.4]) {
      const kinds = ['a', 'b', 'c', 'd'].map((kind) => ({
        kind,
        ...(weight === undefined ? {} : { weight }),
      }))
      const looks = kindLooks(frames(kinds))
      expect(new Set(looks.map(({ dash }) => dash.join()))).toHaveProperty('size', 4)
    }
  })
  it('tell four groups of actuators apart without any colour, and sort them by number', () => {
    const kinds = [10, 2, 1, 3].map((group) => ({ kind: `actuator ${group}`, isDriven: true }))
    const looks = kindLooks(frames(kinds))
    expect(looks.map(({ kind }) => kind)).toEqual(['actuator 1', 'actuator 2', 'actuator 3', 'actuator 10'])
    expect(new Set(looks.map(({ isFull, isNotched }) => `${isFull} ${isNotched}`))).toHaveProperty('size', 4)
    expect(new Set(looks.map(({ dash }) => dash.join()))).toHaveProperty('size', 4)
  })
  it('do not call a strut an actuator because others of its name are driven', () => {
    const looks = kindLooks(frames([{ kind: 'tube' }, { kind: 'tube', isDriven: true }]))
    expect(looks.map(({ isActive, links }) => [isActive, links])).toEqual([
      [false, [0]],
      [true, [1]],
    ])
  })
})
