// Replay pages in a real browser: keys, time, less motion, dark and light, print and pages without script.

import { afterAll, beforeAll, expect, test } from 'vitest'
import { dark, light } from '../../shared/pictures/index.js'
import { boxOf, clock, closePages, drawing, focus, look, openPages, playText, seconds } from './looking.js'
import type { Picture } from './pages.js'

beforeAll(openPages)
afterAll(closePages)

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

test('without script the moments are there', async () => {
  await look('flat', { hasNoScript: true, heightPx: 2200 }, async (page) => {
    const { pixels, width, height } = await page.picture()
    const step = pixels.length / (width * height)
    const wall = [1, 3, 5].map((at) => Number.parseInt(light.wall.slice(at, at + 2), 16))
    let count = 0
    for (let at = 0; at < pixels.length; at += step)
      if (wall.every((part, i) => pixels[at + i] === part)) count++
    // The wall goes through all five moments; in the legend it is 40 pixels long.
    expect(count).toBeGreaterThan(1500)
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
