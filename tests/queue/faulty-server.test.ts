// Servers that cannot be used: each is refused with a clear line and its exit code, soon, once, and never with the
// password. The numbers in brackets are rows of the fault table (DEVELOPERS.md).

import { execFileSync } from 'node:child_process'
import { mkdtempSync, rmSync } from 'node:fs'
import { createServer, type Server } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, afterEach, beforeAll, describe, expect, test } from 'vitest'
import { clusterTimes } from '../../shared/cluster/times.js'
import { type Refusal, renderRefusal } from '../../shared/refusals.js'
import { parseAddress, RedisAgentQueue, RedisCoordinatorQueue } from '../../worker/redis/index.js'
import { freePort, pause, RedisServer } from '../tools/redis-server.js'

const times = clusterTimes(0.2)
const password = 'canary-of-the-pump-house'

const closing: (() => Promise<void> | void)[] = []
afterEach(async () => {
  for (const close of closing.splice(0).reverse()) await close()
})

async function server(...more: string[]): Promise<RedisServer> {
  const started = await RedisServer.start(more)
  closing.push(() => started.close())
  return started
}

function coordinator(url: string, { unprotected = false, ca = '' } = {}): RedisCoordinatorQueue {
  const address = parseAddress(url, ca === '' ? undefined : ca)
  const queue = new RedisCoordinatorQueue({ address, prefix: 'skerry', search: 'pump', times, unprotected })
  closing.push(() => queue.close())
  return queue
}

function agent(url: string): RedisAgentQueue {
  const queue = new RedisAgentQueue({ address: parseAddress(url), prefix: 'skerry', agent: 'a', times })
  closing.push(() => queue.close())
  return queue
}

async function refusalOf(doing: Promise<unknown>): Promise<Refusal> {
  const startMs = performance.now()
  const fault = await doing.then(
    () => undefined,
    (one: Refusal) => one,
  )
  expect(fault, 'it is refused').toBeDefined()
  expect(performance.now() - startMs).toBeLessThan(8 * times.commandMs)
  const text = renderRefusal(fault!)
  expect(text).not.toContain(password)
  return fault!
}

const rows: readonly {
  readonly what: string
  readonly url: () => Promise<string>
  readonly code: string
  readonly exitCode: number
  readonly says: RegExp
}[] = [
  {
    what: '(24) a wrong password',
    url: async () => (await server('--requirepass', 'right')).url.replace('//', `//:${password}@`),
    code: 'queue-access',
    exitCode: 77,
    says: /user or password is wrong/,
  },
  {
    what: '(24) an unknown user',
    url: async () => (await server('--requirepass', 'right')).url.replace('//', `//stranger:${password}@`),
    code: 'queue-access',
    exitCode: 77,
    says: /user or password is wrong/,
  },
  {
    what: '(24) a missing password',
    url: async () => (await server('--requirepass', 'right')).url,
    code: 'queue-access',
    exitCode: 77,
    says: /asks for a password/,
  },
  {
    what: 'nothing there',
    url: async () => `redis://127.0.0.1:${await freePort()}`,
    code: 'queue-unreachable',
    exitCode: 69,
    says: /nothing listens/,
  },
  {
    what: '(28) no such host',
    url: async () => `redis://:${password}@no-such-host.invalid:6379`,
    code: 'queue-unreachable',
    exitCode: 69,
    says: /no host of this name/,
  },
  {
    what: 'TLS asked of a server without',
    url: async () => (await server()).url.replace('redis:', 'rediss:'),
    code: 'queue-tls',
    exitCode: 78,
    says: /server does not speak it/,
  },
  {
    what: 'a server that speaks another language',
    url: async () => `redis://127.0.0.1:${await speaker('HTTP/1.1 400 Bad Request\r\n\r\n')}`,
    code: 'queue-tls',
    exitCode: 78,
    says: /does not speak as Redis does/,
  },
  {
    what: 'a server that says nothing',
    url: async () => `redis://127.0.0.1:${await speaker('')}`,
    code: 'queue-unreachable',
    exitCode: 69,
    says: /no answer|timed out/i,
  },
]

/** Answers everybody with that, whatever they say. */
async function speaker(answer: string): Promise<number> {
  const open = new Set<{ destroy(): void }>()
  const listening: Server = createServer((socket) => {
    open.add(socket)
    socket.on('error', () => {})
    socket.on('data', () => {
      if (answer !== '') socket.write(answer)
    })
  })
  const port = await freePort()
  await new Promise<void>((resolve) => {
    listening.listen(port, '127.0.0.1', resolve)
  })
  closing.push(() => {
    for (const socket of open) socket.destroy()
    listening.close()
  })
  return port
}

describe.each(rows)('$what', ({ url, code, exitCode, says }) => {
  test('is refused to coordinator and agent alike, with what to do', async () => {
    const address = await url()
    for (const queue of [coordinator(address), agent(address)]) {
      const refusal = await refusalOf(queue.open())
      expect(refusal).toMatchObject({ code, exitCode })
      expect(refusal.message).toMatch(says)
      expect(refusal.cure.length).toBeGreaterThan(20)
    }
  })
})

test.each(['redis//x', 'http://x', 'redis://', 'redis://h:1/x'])(
  'the address %s is a usage error',
  (text) => {
    expect(() => parseAddress(text)).toThrow(expect.objectContaining({ code: 'usage', exitCode: 64 }))
  },
)

test('an address that cannot be read is not repeated: its password would be', () => {
  expect(() => parseAddress(`redis://:${password}@ho st`)).toThrow(
    expect.objectContaining({ message: expect.not.stringContaining(password) }),
  )
})

test.each(['allkeys-lru', 'volatile-ttl', 'allkeys-random'])(
  '(22) the eviction policy %s is refused, with the command that mends it',
  async (policy) => {
    const on = await server('--maxmemory-policy', policy)
    const refusal = await refusalOf(coordinator(on.url).open())
    expect(refusal).toMatchObject({ code: 'queue-unfit', exitCode: 78 })
    expect(refusal.message).toContain(policy)
    expect(refusal.cure).toContain('CONFIG SET maxmemory-policy noeviction')
    on.ask('CONFIG', 'SET', 'maxmemory-policy', 'noeviction')
    await coordinator(on.url).open()
  },
)

test('(25) a replica is refused', async () => {
  const [primary, replica] = [await server(), await server()]
  replica.ask('REPLICAOF', '127.0.0.1', `${primary.port}`)
  expect((await refusalOf(coordinator(replica.url).open())).message).toContain('replica')
})

test('a server that others reach without a password is refused unless that is asked for', async () => {
  const on = await server('--bind', '0.0.0.0', '--protected-mode', 'no')
  const address = otherAddress()
  if (address === undefined) return
  const url = `redis://${address}:${on.port}`
  const refusal = await refusalOf(coordinator(url).open())
  expect(refusal).toMatchObject({ code: 'queue-unfit', exitCode: 78 })
  expect(refusal.cure).toContain('--redis-unprotected')
  await coordinator(url, { unprotected: true }).open()
  on.ask('CONFIG', 'SET', 'requirepass', 'right')
  await coordinator(url.replace('//', '//:right@')).open()
})

/** An address of this machine that is not loopback. */
function otherAddress(): string | undefined {
  const words = execFileSync('hostname', ['-I'], { encoding: 'utf8' }).trim().split(/\s+/)
  return words.find((word) => /^\d+\.\d+\.\d+\.\d+$/.test(word) && !word.startsWith('127.'))
}

test('(24) a password that is changed while we work ends it, with the right code and no storm of attempts', async () => {
  const on = await server()
  const queue = coordinator(on.url)
  await queue.open()
  await queue.begin('first')
  on.ask('CONFIG', 'SET', 'requirepass', 'changed')
  on.ask('-a', 'changed', '--no-auth-warning', 'CLIENT', 'KILL', 'TYPE', 'normal')
  let refusal: Refusal | undefined
  for (let tries = 0; tries < 100 && refusal?.code !== 'queue-access'; tries++) {
    await pause(20)
    refusal = await queue.instance().then(
      () => undefined,
      (fault: Refusal) => fault,
    )
  }
  expect(refusal).toMatchObject({ code: 'queue-access', exitCode: 77 })
  const count = () =>
    Number(
      /total_connections_received:(\d+)/.exec(
        on.ask('-a', 'changed', '--no-auth-warning', 'INFO', 'stats'),
      )?.[1],
    )
  const before = count()
  await pause(5 * times.reconnectMostMs)
  // Each question is a connection of its own.
  expect(count() - before).toBeLessThanOrEqual(3)
})

test('(23) a server that takes no more clients is refused with what to raise', async () => {
  const on = await server('--maxclients', '2')
  const first = coordinator(on.url)
  await first.open()
  const refusal = await refusalOf(agent(on.url).open())
  expect(refusal).toMatchObject({ code: 'queue-unreachable', exitCode: 69 })
  expect(refusal.message).toContain('maxclients')
})

test('(21) a server whose memory is full says so, and is used again when there is room', async () => {
  const on = await server('--maxmemory', '8mb', '--maxmemory-policy', 'noeviction')
  const queue = coordinator(on.url)
  await queue.open()
  await queue.begin('first')
  const bytes = new Uint8Array(100_000)
  await queue.putPlugin(bytes)
  on.ask('SETRANGE', 'filler', '8000000', 'x')
  const full = await refusalOf(queue.putPlugin(bytes))
  expect(full).toMatchObject({ code: 'queue-full', exitCode: 69 })
  expect(await queue.instance()).toBe('first')
  on.ask('DEL', 'filler')
  await queue.putPlugin(bytes)
})

describe('TLS', () => {
  let folder: string
  let tlsArguments: string[]

  beforeAll(() => {
    folder = mkdtempSync(join(tmpdir(), 'skerry-tls-'))
    const key = join(folder, 'key.pem')
    const certificate = join(folder, 'certificate.pem')
    execFileSync(
      'openssl',
      [
        ...['req', '-x509', '-newkey', 'rsa:2048', '-nodes', '-days', '2', '-subj', '/CN=queue of the works'],
        ...['-addext', 'subjectAltName=IP:127.0.0.1', '-keyout', key, '-out', certificate],
      ],
      { stdio: 'ignore' },
    )
    tlsArguments = ['--tls-cert-file', certificate, '--tls-key-file', key, '--tls-ca-cert-file', certificate]
    tlsArguments.push('--tls-auth-clients', 'no')
  })
  afterAll(() => rmSync(folder, { recursive: true, force: true }))

  async function tlsServer(): Promise<{ readonly plain: RedisServer; readonly url: string }> {
    const port = await freePort()
    const plain = await server('--tls-port', `${port}`, ...tlsArguments)
    return { plain, url: `rediss://127.0.0.1:${port}` }
  }

  test('with a certificate of the site, named, jobs and answers travel as ever', async () => {
    const { url } = await tlsServer()
    const queue = coordinator(url, { ca: join(folder, 'certificate.pem') })
    await queue.open()
    await queue.begin('first')
    await queue.putPlugin(Uint8Array.of(1, 2, 3))
    expect(await queue.instance()).toBe('first')
  })

  test('a certificate that nobody here knows is refused, and how to name it is said', async () => {
    const { url } = await tlsServer()
    const refusal = await refusalOf(coordinator(url).open())
    expect(refusal).toMatchObject({ code: 'queue-tls', exitCode: 78 })
    expect(refusal.cure).toContain('SKERRY_REDIS_CA')
  })

  test('a server with TLS, addressed without, is refused', async () => {
    const { url } = await tlsServer()
    const refusal = await refusalOf(coordinator(url.replace('rediss:', 'redis:')).open())
    expect(refusal).toMatchObject({ code: 'queue-tls', exitCode: 78 })
  })
})

describe('a server in trouble', () => {
  test('(18) frozen: no call takes longer than its time, and all is well when it goes on', async () => {
    const on = await server()
    const queue = coordinator(on.url)
    await queue.open()
    await queue.begin('first')
    on.signal('SIGSTOP')
    for (let i = 0; i < 3; i++) {
      const startMs = performance.now()
      await expect(queue.instance()).rejects.toMatchObject({ code: 'queue-unreachable' })
      expect(performance.now() - startMs).toBeLessThan(4 * times.commandMs)
    }
    on.signal('SIGCONT')
    await expect.poll(() => queue.instance().catch(() => 'down'), { timeout: 10_000 }).toBe('first')
  })

  test('(16, 19) gone for long and back, empty: calls refuse at once meanwhile, and work within the longest wait after', async () => {
    const on = await server()
    const [queue, worker] = [coordinator(on.url), agent(on.url)]
    await Promise.all([queue.open(), worker.open()])
    await queue.begin('first')
    await on.kill()
    await pause(10 * times.reconnectMostMs)
    const startMs = performance.now()
    await expect(queue.instance()).rejects.toMatchObject({ code: 'queue-unreachable' })
    await expect(worker.take('pump')).rejects.toMatchObject({ code: 'queue-unreachable' })
    expect(performance.now() - startMs).toBeLessThan(200)
    expect(worker.connected).toBe(false)
    await on.start()
    await expect.poll(() => queue.instance().catch(() => 'down'), { timeout: 10_000 }).toBeUndefined()
    await queue.begin('second')
    await expect.poll(() => worker.take('pump').catch(() => 'down'), { timeout: 10_000 }).toBeUndefined()
    let woken = false
    const waiting = worker.waitForWork(['pump'], 20_000).then(() => {
      woken = true
    })
    await pause(100)
    expect(woken).toBe(false)
    on.ask('ZADD', 'skerry:s:pump:work:marker', '0', '0')
    await waiting
  })

  test('(25) that becomes a replica refuses writes as such, and is used again when it leads', async () => {
    const [on, other] = [await server(), await server()]
    const queue = coordinator(on.url)
    await queue.open()
    on.ask('REPLICAOF', '127.0.0.1', `${other.port}`)
    let refusal: Refusal | undefined
    await expect
      .poll(
        async () => {
          refusal = await queue.putPlugin(Uint8Array.of(1)).then(
            () => undefined,
            (fault: Refusal) => fault,
          )
          return refusal?.message ?? ''
        },
        { timeout: 10_000 },
      )
      .toContain('replica')
    expect(refusal?.exitCode).toBe(69)
    on.ask('REPLICAOF', 'NO', 'ONE')
    await expect
      .poll(
        () =>
          queue.putPlugin(Uint8Array.of(1)).then(
            () => 'done',
            () => 'down',
          ),
        { timeout: 10_000 },
      )
      .toBe('done')
  })
})
