// Pictures and replays of a made-up machine: what must be in them, and what must never be.

import { createContext, runInContext } from 'node:vm'
import { describe, expect, it } from 'vitest'
import type { Frames } from '../../../shared/problem.js'
import { bestSvg, clipped } from './best-svg.js'
import { drawPictures } from './draw.js'
import { alwaysCaution, escaped, type PictureFacts, resultSentence } from './facts.js'
import { extentOf, framesFault, kindsOf, lengthText, momentsOf, roundStep, roundStepUp } from './geometry.js'
import { packed, replayHtml } from './replay.js'
import { dark, light, linkStyles, type Theme } from './style.js'

const frameCount = 41
/** A box of four nodes that walks 0.4 m to the right in 4 s, nodding. */
const frames: Frames = {
  dimensions: 2,
  secondsPerFrame: 0.1,
  positions: Array.from({ length: frameCount }, (_, f) => {
    const x = 0.01 * f
    const nod = 0.01 * (f % 4)
    return Float64Array.of(x, 0.01, x + 0.1, 0.01, x, 0.1 + nod, x + 0.1, 0.1)
  }),
  links: [
    { a: 0, b: 1, kind: 'stiff' },
    { a: 0, b: 2, kind: 'actuator 1' },
    { a: 1, b: 3, kind: 'soft' },
    { a: 2, b: 3, kind: 'soft' },
  ],
  nodeRadiiM: [0.004, 0.004, 0.004, 0.004],
  ground: [
    [-1, 0],
    [0.2, 0],
    [0.25, 0.01],
    [0.3, 0],
    [3, 0],
  ],
  markers: [{ node: 2, label: 'puck', radiusM: 0.01 }],
  drive: [{ link: 1, values: Float64Array.from({ length: frameCount }, (_, f) => (f % 2 === 0 ? 1 : -1)) }],
}
const facts: PictureFacts = {
  search: 'culvert <& "crawler"',
  id: 'i3-01842',
  results: [
    { name: 'distance', unit: 'm', value: 0.81234, standardError: 0.0312 },
    { name: 'material', unit: 'kg', value: 0.431 },
  ],
  replicates: 16,
  shown: 'replicate 1 of 16',
  selected: true,
  description: ['one bay, 100 mm long'],
  cautions: [
    { hazard: 'pressure', because: 'bellows hold up to 50 kPa', consult: 'local pressure-equipment rules' },
    { hazard: 'pinching', because: '</script><script>alert(1)</script>', consult: 'a guard' },
  ],
  provenance: ['search digest 3fa91c0a'],
}

function contrast(a: string, b: string): number {
  // Relative luminance and contrast ratio: Web Content Accessibility Guidelines 2.2 (W3C, 2023), definitions.
  const luminance = (colour: string) => {
    const [r, g, blue] = [1, 3, 5].map((at) => {
      const part = Number.parseInt(colour.slice(at, at + 2), 16) / 255
      return part <= 0.04045 ? part / 12.92 : ((part + 0.055) / 1.055) ** 2.4
    })
    return 0.2126 * r! + 0.7152 * g! + 0.0722 * blue!
  }
  const [high, low] = [luminance(a), luminance(b)].sort((x, y) => y - x)
  return (high! + 0.05) / (low! + 0.05)
}

describe('the style', () => {
  for (const [name, theme] of Object.entries({ light, dark }) as [string, Theme][]) {
    it(`has 4.5:1 for text and 3:1 for lines in the ${name} theme`, () => {
      for (const ink of [theme.ink, theme.faint])
        expect(contrast(ink, theme.paper)).toBeGreaterThanOrEqual(4.5)
      expect(contrast(theme.faint, theme.groundFill)).toBeGreaterThanOrEqual(4.5)
      expect(contrast(theme.caution, theme.cautionFill)).toBeGreaterThanOrEqual(4.5)
      for (const line of [...theme.active, ...theme.passive, theme.marker, theme.path, theme.ground]) {
        expect(contrast(line, theme.paper), line).toBeGreaterThanOrEqual(3)
      }
    })
  }
  it('tells kinds apart without colour where there are at most four passive ones, and gives driven ones a width of their own', () => {
    const kinds = ['a', 'b', 'c', 'd'].map((kind) => ({ kind, isActive: false }))
    const styles = linkStyles([...kinds, { kind: 'e', isActive: true }])
    expect(new Set(styles.slice(0, 4).map(({ dash }) => dash.join()))).toHaveProperty('size', 4)
    expect(styles[4]!.width).toBeGreaterThan(2 * styles[0]!.width)
  })
})

describe('the picture', () => {
  const svg = bestSvg(frames, facts)
  it('says name, result with unit, error and sample size, and that the best is chosen', () => {
    const plain = svg.replace(/<[^>]*>/g, ' ')
    expect(plain).toContain(
      'distance 0.812 ± 0.031 m, material 0.431 kg (mean of 16 replicates, ± one standard error)',
    )
    expect(resultSentence({ ...facts, replicates: 1, results: [facts.results[1]!] })).toContain(
      'no uncertainty is known',
    )
    expect(resultSentence({ ...facts, selected: false })).not.toContain('Chosen')
  })
  it('keeps the numbers of its axis apart, however far the machine goes', () => {
    for (const stretch of [0.2, 0.5, 1, 1.4, 2, 3, 7]) {
      const positions = frames.positions.map((frame) => frame.map((x, i) => (i % 2 === 0 ? x * stretch : x)))
      const ground = frames.ground.map(([x, y]) => [x * stretch, y] as const)
      const svg = bestSvg({ ...frames, positions, ground }, facts)
      const ticks = [...svg.matchAll(/<text x="([\d.]+)" y="([\d.]+)"[^>]*text-anchor="middle"[^>]*>/g)]
      const lowest = Math.max(...ticks.map(([, , y]) => Number(y)))
      const along = ticks.filter(([, , y]) => Number(y) === lowest).map(([, x]) => Number(x))
      const gaps = along.slice(1).map((x, i) => x - along[i]!)
      expect(along.length, `stretched ${stretch} times`).toBeGreaterThan(1)
      for (const gap of gaps) expect(gap, `stretched ${stretch} times`).toBeGreaterThan(48)
    }
  })
  it('shrinks with a narrow window instead of running out of it', () => {
    expect(bestSvg(frames, facts)).toMatch(
      /^<svg [^>]*viewBox="0 0 1200 \d+"[^>]*style="max-width:100%;height:auto"/,
    )
  })
  it('shows several moments with their times, all kinds, the marker, an axis and a scale bar with units', () => {
    for (const words of [
      '0.0 s',
      '2.0 s',
      '4.0 s',
      'stiff',
      'soft',
      'actuator 1',
      'puck',
      'along the ground, m',
      '0.1 m',
    ]) {
      expect(svg, words).toContain(`>${words}`)
    }
  })
  it('says in how many fresh simulations the machine failed, and why', () => {
    const failed = { simulations: 9, of: 72, because: 'the gauge sags' }
    for (const one of [bestSvg(frames, { ...facts, failed }), replayHtml(frames, { ...facts, failed })]) {
      const words = one.replace(/<\/text><text[^>]*>|<\/text>\n<text[^>]*>/g, ' ')
      expect(words).toContain('It failed in 9 of 72 fresh simulations, first because: the gauge sags.')
    }
  })
  it('carries every caution in full, and one where the problem names none', () => {
    const unwrapped = (text: string) => text.replace(/<\/text><text[^>]*>/g, ' ')
    for (const one of [svg, bestSvg(frames, { ...facts, cautions: [] })])
      expect(unwrapped(one)).toContain(alwaysCaution)
    expect(unwrapped(svg)).toContain(
      'Pressure: bellows hold up to 50 kPa. Consult: local pressure-equipment rules.',
    )
  })
  it('is balanced XML without script or reference to anything outside', () => {
    const open: string[] = []
    for (const [, close, name, rest] of svg.matchAll(/<(\/?)([a-z]+)((?:[^>"]|"[^"]*")*)>/g)) {
      if (close) expect(open.pop()).toBe(name)
      else if (!rest!.endsWith('/')) open.push(name!)
    }
    expect(open).toEqual([])
    expect(svg).not.toMatch(/<script|href|url\(|@import/)
    expect(svg.replace('http://www.w3.org/2000/svg', '')).not.toMatch(/https?:/)
    expect(svg).not.toMatch(/NaN|Infinity|undefined/)
  })
  it('survives a single frame, no marker, no drive, no ground and a third dimension', () => {
    const bare: Frames = {
      ...frames,
      dimensions: 3,
      positions: [Float64Array.of(0, 0, 0, 1, 0, 0.5)],
      links: [{ a: 0, b: 1, kind: 'rod' }],
      nodeRadiiM: [0, 0],
      ground: [],
      markers: [],
      drive: [],
    }
    expect(framesFault(bare)).toBeUndefined()
    for (const text of [bestSvg(bare, facts), replayHtml(bare, facts)])
      expect(text).not.toMatch(/NaN|Infinity|undefined/)
  })
})

describe('frames of a plug-in', () => {
  it('are drawn when they are sound', () => {
    expect(drawPictures(() => frames, facts)).toHaveProperty('svg')
  })
  it('that throw, are nothing or are wrong end in a sentence, never in a crash', () => {
    const wrong: [() => unknown, RegExp][] = [
      [() => undefined, /cannot be drawn/],
      [() => ({}), /cannot be drawn/],
      [() => ({ ...frames, positions: 3 }), /cannot be drawn/],
      [() => ({ ...frames, nodeRadiiM: [] }), /0 node radii for 4 nodes/],
      [
        () => {
          throw new Error('no \u001b[31mframes')
        },
        /cannot be drawn: no {2}\[31mframes\.$/,
      ],
    ]
    for (const [make, expected] of wrong) {
      const drawn = drawPictures(make as () => Frames, facts)
      expect('fault' in drawn && drawn.fault).toMatch(expected)
    }
  })
})

describe('geometry', () => {
  it('names what is wrong with frames of a plug-in', () => {
    const faults: [Partial<Frames>, RegExp][] = [
      [{ positions: [] }, /no frame/],
      [{ positions: [Float64Array.of(0, Number.NaN)] }, /not finite/],
      [{ positions: [Float64Array.of(0, 0), Float64Array.of(0)] }, /frame 1 has 1/],
      [{ links: [{ a: 0, b: 9, kind: 'x' }] }, /link names a node/],
      [{ markers: [{ node: -1, label: 'x', radiusM: 1 }] }, /marker names a node/],
      [{ nodeRadiiM: [] }, /0 node radii for 4/],
      [{ secondsPerFrame: 0 }, /secondsPerFrame/],
      [{ drive: [{ link: 0, values: Float64Array.of(1) }] }, /drive/],
    ]
    for (const [change, expected] of faults) expect(framesFault({ ...frames, ...change })).toMatch(expected)
    expect(framesFault(frames)).toBeUndefined()
  })
  it('cuts the ground at the edges of the drawing', () => {
    expect(
      clipped(
        [
          [0, 0],
          [10, 10],
        ],
        2,
        4,
      ),
    ).toEqual([
      [2, 2],
      [4, 4],
    ])
    expect(
      clipped(
        [
          [0, 0],
          [3, 3],
          [10, 3],
        ],
        2,
        4,
      ),
    ).toEqual([
      [2, 2],
      [3, 3],
      [4, 3],
    ])
    expect(
      clipped(
        [
          [0, 0],
          [1, 0],
        ],
        2,
        4,
      ),
    ).toEqual([])
  })
  it('finds moments, kinds, extents and round steps', () => {
    expect(momentsOf(frames, 5)).toEqual([0, 10, 20, 30, 40])
    expect(kindsOf(frames)).toEqual([
      { kind: 'stiff', isActive: false },
      { kind: 'soft', isActive: false },
      { kind: 'actuator 1', isActive: true },
    ])
    expect(extentOf(frames, [0])).toEqual({ left: -0.01, right: 0.11, bottom: 0, top: 0.11 })
    expect([roundStep(0.07), roundStep(9), roundStep(1), roundStep(0.2)]).toEqual([0.05, 5, 1, 0.2])
    expect([roundStepUp(0.07), roundStepUp(9), roundStepUp(1), roundStepUp(0.021)]).toEqual([
      0.1, 10, 1, 0.05,
    ])
    expect([lengthText(0.02), lengthText(0.5), lengthText(0.00005)]).toEqual(['20 mm', '0.5 m', '50 µm'])
  })
})

describe('the replay', () => {
  const html = replayHtml(frames, facts)
  const data = JSON.parse(/id="data">(.*?)<\/script>/s.exec(html)![1]!) as {
    x: { base64: string; low: number; step: number }
    nodes: number
  }
  it('is one file whose own policy forbids the network', () => {
    expect(html).toContain(`http-equiv="Content-Security-Policy" content="default-src 'none'`)
    expect(html).not.toMatch(/https?:|<link|<iframe|\bsrc=|import\(|fetch\(|@import/)
  })
  it('cannot be broken out of by names and cautions', () => {
    expect(html).not.toContain('<script>alert')
    expect(html.match(/<script/g)).toHaveLength(2)
    expect(escaped(`<a b="c">&'\u0000`)).toBe('&#60;a b=&#34;c&#34;&#62;&#38;&#39;')
  })
  it('carries cautions, result, a table of the motion and words for keys', () => {
    for (const words of [
      escaped(alwaysCaution),
      'Consult: local pressure-equipment rules',
      '± one standard error',
      'middle of the machine, m',
      'space plays and pauses',
      'moves 0.4 m along',
    ]) {
      expect(html, words).toContain(words)
    }
  })
  it('keeps positions to within half a step, which is 1/131,070 of the extent', () => {
    const bytes = Buffer.from(data.x.base64, 'base64')
    for (const [f, frame] of frames.positions.entries()) {
      for (let n = 0; n < 4; n++) {
        const x = data.x.low + data.x.step * bytes.readUInt16LE(2 * (4 * f + n))
        expect(Math.abs(x - frame[2 * n]!)).toBeLessThanOrEqual(data.x.step * 0.501)
      }
    }
    expect(data.x.step).toBeCloseTo(0.5 / 65_535, 12)
    expect(packed([3, 3])).toMatchObject({ low: 3, step: 1 })
  })
  it('starts paused where motion shall be reduced, plays otherwise; keys step and stop it', () => {
    const still = openPage(html, { reduced: true })
    expect(still.text('play')).toBe('Play')
    expect(still.frame()).toBe(0)
    still.press('ArrowRight')
    still.press('ArrowRight', true)
    expect(still.frame()).toBe(11)
    still.press('End')
    expect(still.text('clock')).toBe('4.00 s of 4.00 s')
    still.press('Home')
    expect(still.frame()).toBe(0)
    const moving = openPage(html, { reduced: false })
    expect(moving.text('play')).toBe('Pause')
    moving.run(1020)
    expect(moving.frame()).toBe(10)
    moving.press(' ')
    moving.run(1020)
    expect(moving.frame()).toBe(10)
    expect(moving.strokes()).toBeGreaterThan(0)
  })
  it('rests at the end, then begins anew', () => {
    const page = openPage(html, { reduced: false })
    page.run(4020)
    expect(page.frame()).toBe(40)
    page.run(900)
    expect(page.frame()).toBe(40)
    page.run(400)
    expect(page.frame()).toBeLessThan(5)
  })
})

/** The page's script in a bare context: elements that remember, a pen that counts, a clock by hand. */
function openPage(html: string, { reduced }: { readonly reduced: boolean }) {
  const script = /<script type="module">(.*?)<\/script>/s.exec(html)![1]!
  let strokes = 0
  const pen = new Proxy(
    {},
    { get: (_, name) => (name === 'stroke' ? () => strokes++ : () => {}), set: () => true },
  )
  const make = (id: string) => {
    const listeners: { [kind: string]: (event: unknown) => void } = {}
    return {
      textContent: id === 'data' ? /id="data">(.*?)<\/script>/s.exec(html)![1]! : '',
      value: id === 'speed' ? '1' : '0',
      checked: true,
      listeners,
      addEventListener: (kind: string, listener: (event: unknown) => void) => {
        listeners[kind] = listener
      },
      setAttribute: () => {},
      getBoundingClientRect: () => ({ width: 640, height: 300 }),
      getContext: () => pen,
    }
  }
  const elements = new Map<string, ReturnType<typeof make>>()
  const element = (id: string) => {
    const one = elements.get(id) ?? make(id)
    elements.set(id, one)
    return one
  }
  let waiting: ((now: number) => void) | undefined
  let now = 0
  const context = createContext({
    document: { getElementById: element, documentElement: {} },
    matchMedia: (query: string) => ({
      matches: query.includes('reduced-motion') && reduced,
      addEventListener: () => {},
    }),
    getComputedStyle: () => ({ fontSize: '16px' }),
    requestAnimationFrame: (callback: (now: number) => void) => {
      waiting = callback
    },
    ResizeObserver: class {
      observe() {}
    },
    location: { hash: '' },
    devicePixelRatio: 1,
    atob,
  })
  runInContext(script, context)
  return {
    text: (id: string) => element(id).textContent,
    frame: () => Number(element('scrub').value),
    press: (key: string, shiftKey = false) =>
      element('stage').listeners.keydown!({ key, shiftKey, preventDefault: () => {} }),
    strokes: () => strokes,
    /** Animation frames every 20 ms. */
    run: (milliseconds: number) => {
      if (now === 0) {
        now = 20
        waiting?.(now)
      }
      for (const end = now + milliseconds; now < end; ) {
        now += 20
        const callback = waiting
        waiting = undefined
        callback?.(now)
      }
    },
  }
}
