// Pictures and replays of a made-up machine: what must be in them, and what must never be.

import { describe, expect, it } from 'vitest'
import type { Frames } from '../../../shared/frames.js'
import { escaped, framesFault, type PackedFrames, unpackFrames } from '../../../shared/pictures/index.js'
import { bestSvg } from './best-svg.js'
import { drawPictures } from './draw.js'
import { alwaysCaution, type PictureFacts, resultSentence } from './facts.js'
import { replayHtml } from './replay.js'
import { replayScript } from './replay-script.js'

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
      const ticks = [
        ...svg.matchAll(/<text [^>]*x="([\d.]+)" y="([\d.]+)"[^>]*text-anchor="middle"[^>]*>-?[\d.]+ m</g),
      ]
      const along = ticks.map(([, x]) => Number(x)).sort((a, b) => a - b)
      const gaps = along.slice(1).map((x, i) => x - along[i]!)
      expect(along.length, `stretched ${stretch} times`).toBeGreaterThan(1)
      for (const gap of gaps) expect(gap, `stretched ${stretch} times`).toBeGreaterThan(60)
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
      'driven longer',
      'path of the puck',
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
    const unwrapped = (text: string) => text.replace(/<\/text>\n?<text[^>]*>/g, ' ')
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
    expect(svg).toMatch(/@media screen and \(prefers-color-scheme:dark\)\{[^<]*\.s-ink\{stroke:#/)
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
    const written = replayHtml(bare, facts).replace(replayScript, '')
    for (const text of [bestSvg(bare, facts), written])
      expect(/.{0,40}(NaN|Infinity|undefined)/.exec(text)?.[0]).toBeUndefined()
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

describe('the replay', () => {
  const html = replayHtml(frames, facts)
  it('is one file whose own policy forbids the network', () => {
    expect(html).toContain(`http-equiv="Content-Security-Policy" content="default-src 'none'`)
    expect(html).not.toMatch(/https?:|<link|<iframe|\bsrc=|import\(|fetch\(|@import/)
  })
  it('cannot be broken out of by names and cautions', () => {
    expect(html).not.toContain('<script>alert')
    expect(html.match(/<script/g)).toHaveLength(2)
    expect(html.match(/<\/script/gi)).toHaveLength(2)
    expect(escaped(`<a b="c">&'\u0000`)).toBe('&#60;a b=&#34;c&#34;&#62;&#38;&#39;')
  })
  it('carries cautions, result, stills, legend, a table of the motion and words for every key', () => {
    for (const words of [
      escaped(alwaysCaution),
      'Consult: local pressure-equipment rules',
      '± one standard error',
      'middle of the machine, m',
      '<dd>play, pause',
      '<dd>a frame back, forward',
      'moves 0.4 m along',
      'class="stills"',
      'path of the puck</li>',
    ]) {
      expect(html.includes(words), words).toBe(true)
    }
    expect(html.includes('<dd>turn left')).toBe(false)
  })
  it('carries the run itself, to far below a pixel', () => {
    const json = /id="data">(.*?)<\/script>/s.exec(html)![1]!
    const back = unpackFrames(JSON.parse(json) as PackedFrames)
    expect(back.positions).toHaveLength(frameCount)
    for (const [f, frame] of frames.positions.entries())
      for (const [i, value] of frame.entries())
        expect(Math.abs(back.positions[f]![i]! - value)).toBeLessThan(1e-5)
  })
})
