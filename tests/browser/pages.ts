// Opening a page in a real browser without any library: Chromium draws it headless, at a stated time of the page's
// own clock, into a PNG that is decoded here.

import { spawnSync } from 'node:child_process'
import { mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { pathToFileURL } from 'node:url'
import { inflateSync } from 'node:zlib'

export interface Picture {
  readonly width: number
  readonly height: number
  /** Bytes of all pixels, row by row. */
  readonly pixels: Uint8Array
}

/** What the page looked like and what it said on its console. */
export interface Look {
  readonly picture: Picture
  readonly complaints: readonly string[]
}

const flags = [
  ...['--headless', '--no-sandbox', '--disable-gpu', '--hide-scrollbars', '--force-device-scale-factor=1'],
  ...['--no-first-run', '--disable-background-networking', '--disable-component-update', '--disable-sync'],
  ...['--disable-quic', '--disable-extensions', '--window-size=1000,800', '--enable-logging=stderr'],
]

/** The page after `milliseconds` of its own time. Every host name is unknown to the browser. */
export function lookAt(file: string, milliseconds: number): Look {
  const program = process.env.SKERRY_CHROMIUM
  if (program === undefined) throw new Error('SKERRY_CHROMIUM is not set: run `npm test -- --only browser`')
  const folder = mkdtempSync(join(tmpdir(), 'skerry-browser-'))
  try {
    const shot = join(folder, 'page.png')
    const args = [
      ...flags,
      `--user-data-dir=${join(folder, 'profile')}`,
      '--host-resolver-rules=MAP * ~NOTFOUND',
      `--virtual-time-budget=${milliseconds}`,
      `--screenshot=${shot}`,
      pathToFileURL(file).href,
    ]
    const done = spawnSync(program, args, { encoding: 'utf8', timeout: 120_000 })
    if (done.status !== 0)
      throw new Error(`${program} ended with ${done.status ?? done.signal}: ${done.stderr}`)
    const complaints = done.stderr.split('\n').filter((line) => /CONSOLE/.test(line))
    return { picture: decodePng(readFileSync(shot)), complaints }
  } finally {
    rmSync(folder, { recursive: true, force: true })
  }
}

/**
 * A PNG of 8 bits a channel, not interlaced, as browsers write it (PNG, 2nd edition, W3C 2003: chunks 5.3,
 * filters 9.2).
 */
export function decodePng(bytes: Uint8Array): Picture {
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength)
  const parts: Uint8Array[] = []
  for (let at = 8; at < bytes.length; at += view.getUint32(at) + 12) {
    const kind = String.fromCharCode(...bytes.subarray(at + 4, at + 8))
    if (kind === 'IDAT') parts.push(bytes.subarray(at + 8, at + 8 + view.getUint32(at)))
  }
  const width = view.getUint32(16)
  const height = view.getUint32(20)
  const channels = bytes[25] === 6 ? 4 : 3
  return {
    width,
    height,
    pixels: unfilter(inflateSync(Buffer.concat(parts)), width * channels, height, channels),
  }
}

function unfilter(raw: Uint8Array, stride: number, height: number, step: number): Uint8Array {
  const pixels = new Uint8Array(stride * height)
  for (let row = 0; row < height; row++) {
    const filter = raw[row * (stride + 1)]!
    for (let column = 0; column < stride; column++) {
      const at = row * stride + column
      const left = column >= step ? pixels[at - step]! : 0
      const up = row > 0 ? pixels[at - stride]! : 0
      const corner = row > 0 && column >= step ? pixels[at - stride - step]! : 0
      const guess = [0, left, up, (left + up) >> 1, nearest(left, up, corner)][filter]!
      pixels[at] = raw[row * (stride + 1) + 1 + column]! + guess
    }
  }
  return pixels
}

/** The Paeth predictor: whichever of the three is nearest to left + up - corner. */
function nearest(left: number, up: number, corner: number): number {
  const guess = left + up - corner
  const [toLeft, toUp, toCorner] = [left, up, corner].map((value) => Math.abs(guess - value)) as [
    number,
    number,
    number,
  ]
  if (toLeft <= toUp && toLeft <= toCorner) return left
  return toUp <= toCorner ? up : corner
}

/** Share of pixels' bytes that differ between two pictures of one size. */
export function difference(a: Picture, b: Picture): number {
  if (a.pixels.length !== b.pixels.length) throw new Error('pictures of different sizes')
  let count = 0
  for (const [index, value] of a.pixels.entries()) if (value !== b.pixels[index]) count += 1
  return count / a.pixels.length
}

/** How many different colours there are, up to 1000. */
export function colours({ pixels, width, height }: Picture): number {
  const step = pixels.length / (width * height)
  const found = new Set<number>()
  for (let at = 0; at < pixels.length && found.size < 1000; at += step) {
    found.add((pixels[at]! << 16) | (pixels[at + 1]! << 8) | pixels[at + 2]!)
  }
  return found.size
}
