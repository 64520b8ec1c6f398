// Why a connection was not made, when the network says nothing that helps: does the server send us away at the door,
// is it TLS on one side only? Asked once, when the first connection fails, with a short try in other ways.

import { createConnection } from 'node:net'
import { connect as connectTls } from 'node:tls'
import type { RedisAddress } from './address.js'

/** What is wrong with `tls` in the address, or undefined when that is not it. */
export async function tlsMismatch(address: RedisAddress, limitMs: number): Promise<string | undefined> {
  if (address.tls) {
    return (await speaksPlainly(address, limitMs))
      ? 'the address says TLS (rediss://), and the server does not speak it'
      : undefined
  }
  return (await speaksTls(address, limitMs))
    ? 'the server speaks TLS only, and the address says nothing of it'
    : undefined
}

/** What a server says by itself to whoever connects; undefined when it says nothing. */
export function greeting({ host, port }: RedisAddress, limitMs: number): Promise<string | undefined> {
  return new Promise((resolve) => {
    let words: string | undefined
    const socket = createConnection({ host, port })
    const end = ending(socket, limitMs, () => resolve(words))
    socket.once('data', (bytes) => {
      words = bytes.toString('latin1').slice(0, 200)
      end(true)
    })
  })
}

/** Redis answers a line of text with a line that begins with + or -, whoever asks. */
function speaksPlainly({ host, port }: RedisAddress, limitMs: number): Promise<boolean> {
  return new Promise((resolve) => {
    const socket = createConnection({ host, port }, () => socket.write('PING\r\n'))
    const end = ending(socket, limitMs, resolve)
    socket.once('data', (bytes) => end(bytes[0] === 0x2b || bytes[0] === 0x2d))
  })
}

function speaksTls({ host, port }: RedisAddress, limitMs: number): Promise<boolean> {
  return new Promise((resolve) => {
    // Only whether there is a handshake; nothing is said over this connection.
    const socket = connectTls({ host, port, rejectUnauthorized: false }, () => end(true))
    const end = ending(socket, limitMs, resolve)
  })
}

interface Closable {
  once(event: 'error' | 'close', call: () => void): unknown
  destroy(): unknown
}

function ending(
  socket: Closable,
  limitMs: number,
  resolve: (truth: boolean) => void,
): (truth: boolean) => void {
  const end = (truth: boolean) => {
    clearTimeout(timer)
    socket.destroy()
    resolve(truth)
  }
  const timer = setTimeout(() => end(false), limitMs)
  socket.once('error', () => end(false))
  socket.once('close', () => end(false))
  return end
}
