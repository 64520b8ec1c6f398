// Replay pages in a real browser: keys, scrubbing, less motion, dark and light, small and large, the turntable, print and
// pages without script.

import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, expect, test } from 'vitest'
import type { PictureFacts } from '../../coordinator/evidence/pictures/facts.js'
import { replayHtml } from '../../coordinator/evidence/pictures/replay.js'
import { dark, light } from '../../shared/pictures/index.js'
import { linkageFrames, solidFrames, trussFrames } from '../frames-fixture.js'
import { type Browser, openBrowser, type Page, type Surroundings } from './driver.js'
import { colours, type Picture } from './pages.js'

const facts: PictureFacts = {
  search: 'culvert-crawler',
  id: 'i3-01842',
  results: [{ name: 'distance', unit: 'm', value: 0.41, standardError: 0.01 }],
  replicates: 24,
  shown: 'a made-up motion',
  selected: false,
  description: ['6 bays of 60 mm'],
  cautions: [
    { hazard: 'pressure', because: 'bellows hold 50 kPa', consult: 'local pressure-equipment rules' },
  ],
  provenance: [],
}
const machines = {
  flat: trussFrames({ bays: 6, chains: 1, frames: 201 }),
  solid: trussFrames({ bays: 5, chains: 3, frames: 201 }),
  linkage: linkageFrames(),
  bodies: solidFrames(),
}
type Machine = keyof typeof machines

let folder = ''
let browser: Browser
const plain: Surroundings = { widthPx: 900, heightPx: 1000, wantsLessMotion: true }

beforeAll(async () => {
  folder = mkdtempSync(join(tmpdir(), 'skerry-looking-'))
  for (const [name, frames] of Object.entries(machines))
    writeFileSync(join(folder, `${name}.html`), replayHtml(frames, facts))
  browser = await openBrowser()
})
afterAll(async () => {
  await browser?.close()
  rmSync(folder, { recursive: true, force: true })
})

/** Opens, tries, and holds that the page complained of nothing. */
async function look(machine: Machine, around: Partial<Surroundings>, attempt: (page: Page) => Promise<void>) {
  const page = await browser.open(join(folder, `${machine}.html`), { ...plain, ...around })
  await attempt(page)
  expect(page.complaints).toEqual([])
  await page.close()
}

const clock = (page: Page) => page.ask<string>(`document.getElementById('clock').textContent`)
const playText = (page: Page) => page.ask<string>(`document.getElementById('play').textContent`)
const focus = (page: Page) => page.ask(`document.getElementById('stage').focus()`)
const boxOf = (page: Page, id: string) =>
  page.ask<{ x: number; y: number; width: number; height: number }>(
    `document.getElementById('${id}').getBoundingClientRect().toJSON()`,
  )
/** The canvas as it is painted, to be compared. */
const drawing = (page: Page) => page.ask<string>(`document.getElementById('canvas').toDataURL()`)
/** How many different colours the canvas has. */
const coloursOnCanvas = (page: Page) =>
  page.ask<number>(
    `(() => { const one = document.getElementById('canvas'); const { data } = one.getContext('2d').getImageData(0, 0, one.width, one.height); return new Set(new Uint32Array(data.buffer)).size })()`,
  )
const seconds = (text: string) => Number(text.split(' ')[0])

test('every documented key of a flat machine does what the page says, with the drawing in focus', async () => {
  await look('flat', {}, async (page) => {
    await page.press('ArrowRight')
    expect(await clock(page), 'not in focus yet').toBe('0.00 s of 8.00 s')
    await focus(page)
    const start = await drawing(page)
    const keys: readonly (readonly [string, boolean, string])[] = [
      ['ArrowRight', false, '0.04 s of 8.00 s'],
      ['ArrowRight', true, '0.44 s of 8.00 s'],
      ['ArrowLeft', false, '0.40 s of 8.00 s'],
      ['End', false, '8.00 s of 8.00 s'],
      ['Home', false, '0.00 s of 8.00 s'],
    ]
    for (const [key, hasShift, expected] of keys) {
      await page.press(key, hasShift)
      expect(await clock(page), key).toBe(expected)
    }
    expect((await drawing(page)) === start, 'back at the start').toBe(true)
    await page.press('f')
    expect(await page.ask(`document.getElementById('follow').checked`)).toBe(false)
    expect((await drawing(page)) === start).toBe(false)
    await page.press('p')
    expect(await page.ask(`document.getElementById('way').checked`)).toBe(false)
    await page.press('+')
    expect(await page.ask(`document.getElementById('speed').value`)).toBe('2')
    await page.press('-')
    await page.press('-')
    expect(await page.ask(`document.getElementById('speed').value`)).toBe('0.5')
    await page.press(' ')
    expect(await playText(page)).toBe('Pause')
    await page.press(' ')
    expect(await playText(page)).toBe('Play')
  })
})

test('it plays by itself and moves, but stands still for people who want less motion', async () => {
  const wait = `new Promise((done) => setTimeout(done, 400))`
  await look('flat', { wantsLessMotion: false }, async (page) => {
    const before = seconds(await clock(page))
    await page.ask(wait)
    expect(seconds(await clock(page))).toBeGreaterThan(before + 0.1)
    expect(await playText(page)).toBe('Pause')
  })
  await look('flat', { wantsLessMotion: true }, async (page) => {
    const before = await drawing(page)
    await page.ask(wait)
    expect(await clock(page)).toBe('0.00 s of 8.00 s')
    expect((await drawing(page)) === before).toBe(true)
  })
})

test('time can be dragged on the slider and on the curves, and named in the address', async () => {
  await look('flat', {}, async (page) => {
    const slider = await boxOf(page, 'scrub')
    const at = (share: number) => [slider.x + share * slider.width, slider.y + slider.height / 2] as const
    await page.drag(at(0.01), at(0.5))
    expect(Math.abs(seconds(await clock(page)) - 4)).toBeLessThan(0.3)
    const strip = await boxOf(page, 'strip')
    await page.click(strip.x + strip.width - 3, strip.y + 10)
    expect(seconds(await clock(page))).toBeGreaterThan(7.8)
    const now = await boxOf(page, 'now')
    expect(Math.abs(now.x - (strip.x + strip.width))).toBeLessThan(12)
  })
  await look('flat', { hash: 'at=2.4', wantsLessMotion: false }, async (page) => {
    expect(await clock(page)).toBe('2.40 s of 8.00 s')
    expect(await playText(page)).toBe('Play')
  })
})

/** The colour of a pixel as in a theme. */
function colourAt({ pixels, width, height }: Picture, x: number, y: number): string {
  const step = pixels.length / (width * height)
  const at = (y * width + x) * step
  return `#${[0, 1, 2].map((i) => pixels[at + i]!.toString(16).padStart(2, '0')).join('')}`
}

test('the page and its drawing are dark where people want it, light otherwise', async () => {
  for (const [isDark, theme] of [
    [true, dark],
    [false, light],
  ] as const) {
    await look('flat', { isDark }, async (page) => {
      const picture = await page.picture()
      const stage = await boxOf(page, 'canvas')
      expect(colourAt(picture, 2, 2)).toBe(theme.paper)
      const [left, bottom] = [Math.round(stage.x), Math.round(stage.y + stage.height)]
      expect(colourAt(picture, left + 5, bottom - 5), 'the ground in the canvas').toBe(theme.groundFill)
    })
  }
})

const sizes = [360, 768, 1280, 2560]
test.each(Object.keys(machines) as Machine[])(
  'the page of %s fits windows from 360 to 2560 pixels',
  async (machine) => {
    for (const widthPx of sizes) {
      await look(machine, { widthPx, heightPx: Math.min(1600, Math.max(700, widthPx)) }, async (page) => {
        const wide = await page.ask<number>('document.scrollingElement.scrollWidth')
        expect(wide, 'no sideways scrolling').toBeLessThanOrEqual(widthPx)
        const stage = await boxOf(page, 'canvas')
        expect(stage.width).toBeGreaterThan(0.85 * Math.min(widthPx, 2310))
        expect(stage.height).toBeGreaterThan(200)
        // Target size, level AA: 24 by 24 pixels (WCAG 2.2, criterion 2.5.8).
        const small = await page.ask<string[]>(
          `[...document.querySelectorAll('button, select, input, summary, label')].filter((one) => { const { width, height } = one.getBoundingClientRect(); return width > 0 && one.type !== 'checkbox' && (width < 24 || height < 24) }).map((one) => one.outerHTML)`,
        )
        expect(small).toEqual([])
        expect(await coloursOnCanvas(page)).toBeGreaterThan(20)
      })
    }
  },
)

test('the turntable turns by dragging and by keys, and comes back', async () => {
  await look('solid', {}, async (page) => {
    await focus(page)
    const start = await drawing(page)
    const { x, y, width, height } = await boxOf(page, 'canvas')
    await page.drag([x + 0.4 * width, y + 0.5 * height], [x + 0.6 * width, y + 0.5 * height])
    expect((await drawing(page)) === start, 'dragged').toBe(false)
    await page.press('4')
    expect((await drawing(page)) === start, 'corner view again').toBe(true)
    const seen = new Set([start])
    for (const key of ['d', 'd', 'w', '1', '2', '3', 's']) {
      await page.press(key)
      const now = await drawing(page)
      expect(seen.has(now), key).toBe(false)
      seen.add(now)
    }
    expect(await clock(page), 'time stands').toBe('0.00 s of 8.00 s')
  })
})

test('the buttons of the turntable do what their keys do', async () => {
  await look('solid', {}, async (page) => {
    await focus(page)
    await page.press('3')
    const byKey = await drawing(page)
    await page.press('4')
    await page.ask(`document.querySelector('button[data-key="3"]').click()`)
    expect((await drawing(page)) === byKey).toBe(true)
  })
})

test('print shows the moments and the cautions instead of the player, in light colours', async () => {
  await look('flat', { isPrint: true, isDark: true }, async (page) => {
    const shown = (selector: string) =>
      page.ask<boolean>(`document.querySelector('${selector}').getBoundingClientRect().height > 0`)
    expect(await shown('#stage')).toBe(false)
    expect(await shown('.controls')).toBe(false)
    expect(await shown('.stills')).toBe(true)
    expect(await shown('.caution')).toBe(true)
    expect(colourAt(await page.picture(), 2, 2)).toBe(light.paper)
  })
})

test('without script the moments, the legend and the table are there', async () => {
  await look('flat', { hasNoScript: true }, async (page) => {
    expect(colours(await page.picture())).toBeGreaterThan(20)
  })
})

test('the keys on the page are those that work: Tab reaches the drawing, and its help is tied to it', async () => {
  await look('solid', {}, async (page) => {
    await page.press('Tab')
    expect(await page.ask(`document.activeElement.id`)).toBe('stage')
    const help = await page.ask<string>(
      `document.getElementById(document.activeElement.getAttribute('aria-describedby')).textContent`,
    )
    for (const word of [
      'play, pause',
      'a frame back',
      'first, last frame',
      'slower, faster',
      'turn left, right',
    ])
      expect(help).toContain(word)
  })
})
