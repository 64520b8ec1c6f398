// Replay pages in a real browser: windows of every size, and the turntable.

import { afterAll, beforeAll, expect, test } from 'vitest'
import {
  boxOf,
  clock,
  closePages,
  coloursOnCanvas,
  drawing,
  focus,
  look,
  type Machine,
  machines,
  openPages,
} from './looking.js'

beforeAll(openPages)
afterAll(closePages)

const sizes = [360, 1280, 2560]
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
