// Driving a real browser without any library: Chromium's own protocol (Chrome DevTools Protocol) over a pipe, file
// descriptors 3 and 4, one JSON object a message, each ended by a zero byte.

import { type ChildProcess, spawn } from 'node:child_process'
import { mkdtempSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import type { Readable, Writable } from 'node:stream'
import { pathToFileURL } from 'node:url'
import { decodePng, type Picture } from './pages.js'

interface Message {
  readonly id?: number
  readonly method?: string
  readonly sessionId?: string
  readonly params?: { readonly [name: string]: unknown }
  readonly result?: unknown
  readonly error?: { readonly message: string }
}
type Parameters = { readonly [name: string]: unknown }
type Send = (method: string, params?: Parameters) => Promise<unknown>

export interface Surroundings {
  readonly widthPx: number
  readonly heightPx: number
  readonly isDark?: boolean
  readonly wantsLessMotion?: boolean
  readonly isPrint?: boolean
  readonly hasNoScript?: boolean
  /** As after '#' in an address. */
  readonly hash?: string
}

export interface Page {
  /** The value of an expression of the page; must be plain data. */
  readonly ask: <T>(expression: string) => Promise<T>
  /** A key as KeyboardEvent.key names it, pressed and released where the focus is. */
  readonly press: (key: string, hasShift?: boolean) => Promise<void>
  readonly click: (x: number, y: number) => Promise<void>
  readonly drag: (from: readonly [number, number], to: readonly [number, number]) => Promise<void>
  readonly picture: () => Promise<Picture>
  readonly png: () => Promise<Uint8Array>
  /** Errors and warnings of the page so far. */
  readonly complaints: readonly string[]
  readonly close: () => Promise<void>
}

export interface Browser {
  readonly open: (file: string, surroundings: Surroundings) => Promise<Page>
  readonly close: () => Promise<void>
}

const flags = [
  ...['--headless', '--no-sandbox', '--disable-gpu', '--hide-scrollbars', '--force-device-scale-factor=1'],
  ...['--no-first-run', '--disable-background-networking', '--disable-component-update', '--disable-sync'],
  ...['--disable-extensions', '--remote-debugging-pipe', '--host-resolver-rules=MAP * ~NOTFOUND'],
]

/** Starts one browser for many pages; close it, or it stays. */
export async function openBrowser(): Promise<Browser> {
  const program = process.env.SKERRY_CHROMIUM
  if (program === undefined) throw new Error('SKERRY_CHROMIUM is not set: run `npm test -- --only browser`')
  const folder = mkdtempSync(join(tmpdir(), 'skerry-browser-'))
  const child = spawn(program, [...flags, `--user-data-dir=${join(folder, 'profile')}`], {
    stdio: ['ignore', 'ignore', 'ignore', 'pipe', 'pipe'],
  })
  const wire = wireOf(child)
  return {
    open: (file, surroundings) => openPage(wire, file, surroundings),
    close: async () => {
      const ended = new Promise((resolve) => child.once('exit', resolve))
      await wire.send('Browser.close').catch(() => child.kill('SIGKILL'))
      await ended
      rmSync(folder, { recursive: true, force: true, maxRetries: 5 })
    },
  }
}

interface Wire {
  readonly send: (method: string, params?: Parameters, sessionId?: string) => Promise<unknown>
  readonly listen: (listener: (message: Message) => void) => void
}

function wireOf(child: ChildProcess): Wire {
  const [, , , input, output] = child.stdio as unknown as [null, null, null, Writable, Readable]
  const waiting = new Map<number, { resolve: (value: unknown) => void; reject: (error: Error) => void }>()
  const listeners: ((message: Message) => void)[] = []
  let rest = ''
  output.setEncoding('utf8')
  output.on('data', (text: string) => {
    const pieces = (rest + text).split('\0')
    rest = pieces.pop()!
    for (const piece of pieces) receive(JSON.parse(piece) as Message)
  })
  child.once('exit', () => {
    for (const { reject } of waiting.values()) reject(new Error('the browser ended'))
  })
  const receive = (message: Message) => {
    for (const listener of listeners) listener(message)
    const one = message.id === undefined ? undefined : waiting.get(message.id)
    if (one === undefined) return
    waiting.delete(message.id!)
    if (message.error) one.reject(new Error(message.error.message))
    else one.resolve(message.result)
  }
  let last = 0
  return {
    listen: (listener) => listeners.push(listener),
    send: (method, params = {}, sessionId) =>
      new Promise((resolve, reject) => {
        const id = ++last
        waiting.set(id, { resolve, reject })
        input.write(`${JSON.stringify({ id, method, params, ...(sessionId ? { sessionId } : {}) })}\0`)
      }),
  }
}

async function openPage(wire: Wire, file: string, around: Surroundings): Promise<Page> {
  const { targetId } = (await wire.send('Target.createTarget', { url: 'about:blank' })) as {
    targetId: string
  }
  const attached = await wire.send('Target.attachToTarget', { targetId, flatten: true })
  const { sessionId } = attached as { sessionId: string }
  const send: Send = (method, params) => wire.send(method, params, sessionId)
  const complaints: string[] = []
  let loaded = () => {}
  wire.listen((message) => {
    if (message.sessionId !== sessionId) return
    if (message.method === 'Page.loadEventFired') loaded()
    const text = complaintOf(message)
    if (text !== undefined) complaints.push(text)
  })
  for (const domain of ['Page', 'Runtime', 'Log']) await send(`${domain}.enable`)
  await surround(send, around)
  const isLoaded = new Promise<void>((resolve) => {
    loaded = resolve
  })
  const hash = around.hash === undefined ? '' : `#${around.hash}`
  await send('Page.navigate', { url: pathToFileURL(file).href + hash })
  await isLoaded
  return {
    ...handsOf(send),
    complaints,
    close: async () => void (await wire.send('Target.closeTarget', { targetId })),
  }
}

async function surround(send: Send, around: Surroundings): Promise<void> {
  const size = { width: around.widthPx, height: around.heightPx, deviceScaleFactor: 1, mobile: false }
  await send('Emulation.setDeviceMetricsOverride', size)
  await send('Emulation.setEmulatedMedia', {
    media: around.isPrint ? 'print' : 'screen',
    features: [
      { name: 'prefers-color-scheme', value: around.isDark ? 'dark' : 'light' },
      { name: 'prefers-reduced-motion', value: around.wantsLessMotion ? 'reduce' : 'no-preference' },
    ],
  })
  if (around.hasNoScript) await send('Emulation.setScriptExecutionDisabled', { value: true })
}

function complaintOf({ method, params }: Message): string | undefined {
  if (method === 'Runtime.exceptionThrown') return JSON.stringify(params?.exceptionDetails)
  const entry = params?.entry as { level: string; text: string } | undefined
  if (method === 'Log.entryAdded' && entry && entry.level !== 'verbose') return entry.text
  return undefined
}

function handsOf(send: Send): Omit<Page, 'complaints' | 'close'> {
  const mouse = (type: string, [x, y]: readonly [number, number], buttons: number) =>
    send('Input.dispatchMouseEvent', { type, x, y, button: 'left', buttons, clickCount: 1 })
  const png = async () => {
    const { data } = (await send('Page.captureScreenshot', { format: 'png' })) as { data: string }
    return new Uint8Array(Buffer.from(data, 'base64'))
  }
  return {
    ask: async <T>(expression: string) => {
      const answer = await send('Runtime.evaluate', { expression, returnByValue: true, awaitPromise: true })
      const { result, exceptionDetails } = answer as { result: { value: T }; exceptionDetails?: unknown }
      if (exceptionDetails) throw new Error(JSON.stringify(exceptionDetails))
      return result.value
    },
    press: async (key, hasShift = false) => {
      const text = key.length === 1 ? { text: key } : {}
      const event = { key, modifiers: hasShift ? 8 : 0, ...text }
      await send('Input.dispatchKeyEvent', { type: key.length === 1 ? 'keyDown' : 'rawKeyDown', ...event })
      await send('Input.dispatchKeyEvent', { type: 'keyUp', ...event })
    },
    click: async (x, y) => {
      await mouse('mousePressed', [x, y], 1)
      await mouse('mouseReleased', [x, y], 0)
    },
    drag: async (from, to) => {
      await mouse('mousePressed', from, 1)
      for (const share of [0.25, 0.5, 0.75, 1])
        await mouse(
          'mouseMoved',
          [from[0] + share * (to[0] - from[0]), from[1] + share * (to[1] - from[1])],
          1,
        )
      await mouse('mouseReleased', to, 0)
    },
    png,
    picture: async () => decodePng(await png()),
  }
}
