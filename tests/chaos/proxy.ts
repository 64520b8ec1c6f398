// A TCP proxy that behaves as badly as a network does: it delays, holds back one direction of a connection (half-open),
// lets through a trickle, or cuts. What it does to which connection follows from its seed. Bytes keep their order and
// none is invented, so that everything it does could happen on a real line.

import { createConnection, createServer, type Server, type Socket } from 'node:net'
import { type Stream, stream } from '../../shared/streams.js'

export const troubles = ['delay', 'cut', 'half-open up', 'half-open down', 'trickle'] as const
export type Trouble = (typeof troubles)[number]

const longestDelayMs = 120
const trickleBytesPerMs = 2

/** One direction of one connection. */
class Lane {
  private readonly to: Socket
  private readonly draw: Stream
  private readonly waiting: { readonly bytes: Buffer; readonly dueMs: number }[] = []
  private timer: NodeJS.Timeout | undefined
  private lastDueMs = 0
  private silentUntilMs = 0
  private delayUntilMs = 0
  private trickleUntilMs = 0

  constructor(to: Socket, draw: Stream) {
    this.to = to
    this.draw = draw
  }

  take(bytes: Buffer): void {
    const nowMs = performance.now()
    const delayMs = nowMs < this.delayUntilMs ? longestDelayMs * this.draw.uniform() : 0
    const trickleMs = nowMs < this.trickleUntilMs ? bytes.length / trickleBytesPerMs : 0
    // In order: nothing overtakes what came before it.
    this.lastDueMs = Math.max(this.lastDueMs, nowMs + delayMs, this.silentUntilMs) + trickleMs
    this.waiting.push({ bytes, dueMs: this.lastDueMs })
    this.pump()
  }

  silence(ms: number): void {
    this.silentUntilMs = performance.now() + ms
  }
  delay(ms: number): void {
    this.delayUntilMs = performance.now() + ms
  }
  trickle(ms: number): void {
    this.trickleUntilMs = performance.now() + ms
  }

  close(): void {
    clearTimeout(this.timer)
    this.waiting.length = 0
  }

  private pump(): void {
    clearTimeout(this.timer)
    const nowMs = performance.now()
    while (this.waiting[0] && Math.max(this.waiting[0].dueMs, this.silentUntilMs) <= nowMs)
      this.to.write(this.waiting.shift()!.bytes)
    const [next] = this.waiting
    if (!next) return
    const waitMs = Math.max(next.dueMs, this.silentUntilMs) - nowMs
    this.timer = setTimeout(() => this.pump(), Math.max(1, waitMs))
  }
}

/** A connection of a client through the proxy. */
class Link {
  readonly up: Lane
  readonly down: Lane
  readonly closed: Promise<void>
  private readonly sockets: readonly [Socket, Socket]
  private timer: NodeJS.Timeout | undefined

  constructor(client: Socket, server: Socket, draw: Stream) {
    this.sockets = [client, server]
    this.up = new Lane(server, draw)
    this.down = new Lane(client, draw)
    client.on('data', (bytes: Buffer) => this.up.take(bytes))
    server.on('data', (bytes: Buffer) => this.down.take(bytes))
    this.closed = new Promise((resolve) => {
      for (const socket of this.sockets) {
        socket.setNoDelay(true)
        socket.on('error', () => {})
        socket.once('close', () => {
          this.cut()
          resolve()
        })
      }
    })
  }

  suffer(trouble: Trouble, ms: number, cutAfter: boolean): void {
    if (trouble === 'cut') this.cut()
    if (trouble === 'half-open up') this.up.silence(ms)
    if (trouble === 'half-open down') this.down.silence(ms)
    for (const lane of [this.up, this.down]) {
      if (trouble === 'delay') lane.delay(ms)
      if (trouble === 'trickle') lane.trickle(ms)
    }
    // A silent direction ends as either kind does: everything arrives after all, or the connection is lost.
    if (trouble.startsWith('half-open') && cutAfter) this.timer = setTimeout(() => this.cut(), ms)
  }

  cut(): void {
    clearTimeout(this.timer)
    this.up.close()
    this.down.close()
    for (const socket of this.sockets) socket.destroy()
  }
}

export class BadLine {
  readonly port: number
  /** Connections that met each trouble. */
  readonly met = new Map<Trouble, number>()
  private readonly server: Server
  private readonly links = new Set<Link>()
  private readonly draw: Stream

  private constructor(server: Server, port: number, draw: Stream) {
    this.server = server
    this.port = port
    this.draw = draw
  }

  /** Listens on a free port of loopback for what is meant for `targetPort`. */
  static async open(targetPort: number, seed: number): Promise<BadLine> {
    let proxy: BadLine | undefined
    const server = createServer((client) => proxy?.link(client, createConnection(targetPort, '127.0.0.1')))
    const port = await new Promise<number>((resolve, reject) => {
      server.once('error', reject)
      server.listen(0, '127.0.0.1', () => {
        const address = server.address()
        resolve(typeof address === 'object' && address ? address.port : 0)
      })
    })
    proxy = new BadLine(server, port, stream(seed, 'weather', 31))
    return proxy
  }

  get url(): string {
    return `redis://127.0.0.1:${this.port}`
  }

  /** Brings this trouble for so long over about half of the connections there are, and one of them at least. */
  trouble(trouble: Trouble, ms: number): void {
    const all = [...this.links]
    const chosen = all.filter(() => this.draw.chance(1, 2))
    if (chosen.length === 0 && all.length > 0) chosen.push(all[this.draw.below(all.length)]!)
    for (const link of chosen) link.suffer(trouble, ms, this.draw.chance(1, 2))
    this.met.set(trouble, (this.met.get(trouble) ?? 0) + chosen.length)
  }

  async close(): Promise<void> {
    for (const link of this.links) link.cut()
    await new Promise((resolve) => this.server.close(resolve))
  }

  private link(client: Socket, server: Socket): void {
    const link = new Link(client, server, this.draw)
    this.links.add(link)
    void link.closed.then(() => this.links.delete(link))
  }
}
