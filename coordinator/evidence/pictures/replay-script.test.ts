// The script of the replay pages: bundled from the sources as they are now, painting what the core draws, and behaving
// in a page whose clock and keys are turned by hand.

import { readFileSync } from 'node:fs'
import { createContext, runInContext } from 'node:vm'
import { describe, expect, it } from 'vitest'
import {
  dark,
  drawStage,
  light,
  type PackedFrames,
  type Pen,
  paintCanvas,
  sceneOf,
  startPlayer,
  svgElements,
  unpackFrames,
} from '../../../shared/pictures/index.js'
import { trussFrames } from '../../../tests/frames-fixture.js'
import { bundle, entry, moduleText, target } from '../../../tests/tools/replay-script.mjs'
import type { PictureFacts } from './facts.js'
import { replayHtml } from './replay.js'
import { bundledFrom, replayScript } from './replay-script.js'

const root = new URL('../../../', import.meta.url)
const frames = trussFrames({ bays: 3, chains: 1, frames: 101 })
const facts: PictureFacts = {
  search: 'made up',
  id: 'i0-00001',
  results: [{ name: 'distance', unit: 'm', value: 1 }],
  replicates: 1,
  shown: 'a formula',
  selected: false,
  description: [],
  cautions: [],
  provenance: [],
}
const html = replayHtml(frames, facts)

describe('the script in the page', () => {
  it('is what `node tests/tools/replay-script.mjs` makes of the sources now', () => {
    const { script, sources } = bundle()
    expect(
      readFileSync(new URL(target, root), 'utf8') === moduleText(script),
      'run it and commit the result',
    ).toBe(true)
    expect(replayScript).toBe(script)
    expect(new URL(bundledFrom, new URL(target, root)).href).toBe(new URL(entry, root).href)
    // One drawing core for stills and motion.
    for (const part of ['draw', 'draw-links', 'scene', 'stage', 'paint-canvas', 'player'])
      expect(sources).toContain(`shared/pictures/${part}.ts`)
    expect(html).toContain(script)
  })
  it.each(['light', 'dark'])(
    'paints exactly the display list that the stills are written from, in the %s theme',
    (name) => {
      const page = openPage({ isDark: name === 'dark' })
      page.press('End')
      const scene = sceneOf(unpackFrames(packedIn(html)))
      const player = { ...startPlayer(scene, true), at: scene.lastFrame }
      const drawn = drawStage(scene, player, page.stage, 1)
      const expected: string[] = []
      paintCanvas(loggingPen(expected), drawn, name === 'dark' ? dark : light)
      const painted = page.calls('canvas')
      expect(expected.length).toBeGreaterThan(100)
      expect(painted.slice(-expected.length)).toEqual(expected)
      expect(svgElements(drawn).length).toBeGreaterThan(1000)
    },
  )
})

describe('a page', () => {
  it('starts paused where motion shall be reduced, plays otherwise; keys step and stop it', () => {
    const still = openPage({ isReduced: true })
    expect(still.text('play')).toBe('Play')
    expect(still.frame()).toBe(0)
    still.press('ArrowRight')
    still.press('ArrowRight', true)
    expect(still.frame()).toBe(11)
    still.press('End')
    expect(still.text('clock')).toBe('4.00 s of 4.00 s')
    still.press('Home')
    expect(still.frame()).toBe(0)
    const moving = openPage({})
    expect(moving.text('play')).toBe('Pause')
    moving.run(1000)
    expect(moving.frame()).toBe(25)
    moving.press(' ')
    moving.run(1000)
    expect(moving.frame()).toBe(25)
  })
  it('rests at the end, then begins anew', () => {
    const page = openPage({})
    page.run(4000)
    expect(page.frame()).toBe(100)
    page.run(900)
    expect(page.frame()).toBe(100)
    page.run(400)
    expect(page.frame()).toBeLessThan(10)
  })
  it('obeys its controls: time, speed, follow, path', () => {
    const page = openPage({ isReduced: true })
    page.set('scrub', 'input', { value: '40' })
    expect(page.text('clock')).toBe('1.60 s of 4.00 s')
    page.set('speed', 'change', { value: '0.25' })
    page.set('play', 'click', {})
    page.run(1000)
    expect(page.frame()).toBe(46)
    const before = page.calls('canvas').length
    page.set('follow', 'change', { checked: false })
    page.set('way', 'change', { checked: false })
    expect(page.calls('canvas').length).toBeGreaterThan(before)
  })
  it('opens at a time that its address names', () => {
    const page = openPage({ hash: '#at=2.4' })
    expect(page.frame()).toBe(60)
    expect(page.text('play')).toBe('Play')
  })
  it('repaints nothing while it stands still', () => {
    const page = openPage({ isReduced: true })
    const before = page.calls('canvas').length
    page.run(500)
    expect(page.calls('canvas').length).toBe(before)
  })
})

function packedIn(page: string): PackedFrames {
  return JSON.parse(/id="data">(.*?)<\/script>/s.exec(page)![1]!) as PackedFrames
}

const painters = [
  'beginPath',
  'closePath',
  'moveTo',
  'lineTo',
  'arc',
  'fill',
  'stroke',
  'fillText',
  'strokeText',
]

/** A pen that writes down what is done with it: calls with their numbers, and colours set. */
function loggingPen(log: string[]): Pen {
  return new Proxy(
    {},
    {
      get:
        (_, name) =>
        (...given: unknown[]) => {
          if (painters.includes(String(name))) log.push(`${String(name)} ${given.join(' ')}`)
        },
      set: (_, name, value) => {
        if (name === 'fillStyle' || name === 'strokeStyle' || name === 'lineWidth')
          log.push(`${name} ${value}`)
        return true
      },
    },
  ) as Pen
}

const stage = { leftPx: 0, topPx: 0, widthPx: 640, heightPx: 300 }

function fakeElement(id: string) {
  const listeners: { [kind: string]: (event: unknown) => void } = {}
  const log: string[] = []
  const pen = loggingPen(log)
  return {
    textContent: id === 'data' ? JSON.stringify(packedIn(html)) : '',
    value: '0',
    checked: true,
    style: {},
    listeners,
    log,
    addEventListener: (kind: string, listener: (event: unknown) => void) => {
      listeners[kind] = listener
    },
    setAttribute: () => {},
    getBoundingClientRect: () => ({ width: stage.widthPx, height: stage.heightPx, left: 0 }),
    getContext: () => pen,
  }
}

/** The page's script in a bare context: elements that remember, a clock by hand. */
function openPage(of: { readonly isReduced?: boolean; readonly isDark?: boolean; readonly hash?: string }) {
  const elements = new Map<string, ReturnType<typeof fakeElement>>()
  const element = (id: string) => {
    const one = elements.get(id) ?? fakeElement(id)
    elements.set(id, one)
    return one
  }
  const matches = (query: string) =>
    query.includes('reduced-motion') ? of.isReduced === true : query.includes('dark') && of.isDark === true
  let waiting: ((now: number) => void) | undefined
  let now = 1000
  const context = createContext({
    document: { getElementById: element, documentElement: {}, querySelectorAll: () => [] },
    matchMedia: (query: string) => ({ matches: matches(query), addEventListener: () => {} }),
    getComputedStyle: () => ({ fontSize: '16px' }),
    requestAnimationFrame: (callback: (now: number) => void) => {
      waiting = callback
    },
    ResizeObserver: class {
      observe() {}
    },
    location: { hash: of.hash ?? '' },
    devicePixelRatio: 1,
  })
  runInContext(replayScript, context)
  const tick = () => {
    const callback = waiting
    waiting = undefined
    callback?.(now)
  }
  return {
    stage,
    text: (id: string) => element(id).textContent,
    frame: () => Number(element('scrub').value),
    calls: (id: string) => element(id).log,
    press: (key: string, shiftKey = false) =>
      element('stage').listeners.keydown!({ key, shiftKey, preventDefault: () => {} }),
    set: (id: string, kind: string, values: { value?: string; checked?: boolean }) => {
      Object.assign(element(id), values)
      element(id).listeners[kind]!({})
    },
    /** Animation frames every 20 ms, and a hair more than the time asked for, against rounding. */
    run: (milliseconds: number) => {
      tick()
      for (const end = now + milliseconds; now < end - 1; ) {
        now += 20.0001
        tick()
      }
    },
  }
}
