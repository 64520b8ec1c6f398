// Replay pages of made-up machines, opened in a real browser: what the tests of looking at machines share.

import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { expect } from 'vitest'
import type { PictureFacts } from '../../coordinator/evidence/pictures/facts.js'
import { replayHtml } from '../../coordinator/evidence/pictures/replay.js'
import { linkageFrames, solidFrames, trussFrames } from '../frames-fixture.js'
import { type Browser, openBrowser, type Page, type Surroundings } from './driver.js'

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
export const machines = {
  flat: trussFrames({ bays: 6, chains: 1, frames: 201 }),
  solid: trussFrames({ bays: 5, chains: 3, frames: 201 }),
  linkage: linkageFrames(),
  bodies: solidFrames(),
}
export type Machine = keyof typeof machines

let folder = ''
let browser: Browser
const plain: Surroundings = { widthPx: 900, heightPx: 1000, wantsLessMotion: true }

/** For beforeAll: writes the pages and starts a browser. */
export async function openPages(): Promise<void> {
  folder = mkdtempSync(join(tmpdir(), 'skerry-looking-'))
  for (const [name, frames] of Object.entries(machines))
    writeFileSync(join(folder, `${name}.html`), replayHtml(frames, facts))
  browser = await openBrowser()
}

/** For afterAll. */
export async function closePages(): Promise<void> {
  await browser?.close()
  rmSync(folder, { recursive: true, force: true })
}

/** Opens, tries, and holds that the page complained of nothing. */
export async function look(
  machine: Machine,
  around: Partial<Surroundings>,
  attempt: (page: Page) => Promise<void>,
) {
  const page = await browser.open(join(folder, `${machine}.html`), { ...plain, ...around })
  await attempt(page)
  expect(page.complaints).toEqual([])
  await page.close()
}

export const clock = (page: Page) => page.ask<string>(`document.getElementById('clock').textContent`)
export const playText = (page: Page) => page.ask<string>(`document.getElementById('play').textContent`)
export const focus = (page: Page) => page.ask(`document.getElementById('stage').focus()`)
export const boxOf = (page: Page, id: string) =>
  page.ask<{ x: number; y: number; width: number; height: number }>(
    `document.getElementById('${id}').getBoundingClientRect().toJSON()`,
  )
/** The canvas as it is painted, to be compared. */
export const drawing = (page: Page) => page.ask<string>(`document.getElementById('canvas').toDataURL()`)
/** How many different colours the canvas has. */
export const coloursOnCanvas = (page: Page) =>
  page.ask<number>(
    `(() => { const one = document.getElementById('canvas'); const { data } = one.getContext('2d').getImageData(0, 0, one.width, one.height); return new Set(new Uint32Array(data.buffer)).size })()`,
  )
export const seconds = (text: string) => Number(text.split(' ')[0])
