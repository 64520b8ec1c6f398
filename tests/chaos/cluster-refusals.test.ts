// Promise: what is wrong with a cluster is said once, in words, with its exit code, and nobody storms the server with
// attempts. Whole processes. Wrong addresses, two searches of one name: tests/queue/run.test.ts; another protocol:
// tests/queue/agent.test.ts; servers that cannot be used: tests/queue/faulty-server.test.ts.

import { execFileSync } from 'node:child_process'
import { randomBytes } from 'node:crypto'
import { chmodSync } from 'node:fs'
import { join } from 'node:path'
import { afterEach, beforeAll, beforeEach, expect, test } from 'vitest'
import { Site } from '../queue/agent-site.js'
import { ensureBuilt } from '../tools/built.js'
import { freePort, RedisServer } from '../tools/redis-server.js'
import { Bench, hears, reportOf, searchOf, waitingProblem } from './programs.js'

const scale = 0.2
let bench: Bench
let server: RedisServer | undefined
beforeAll(() => ensureBuilt(), 120_000)
beforeEach(() => {
  bench = new Bench(scale)
  bench.write('problem.js', waitingProblem(3))
  bench.write('search.yaml', searchOf(200))
})
afterEach(async () => {
  await bench.close()
  await server?.close()
  server = undefined
})

/** What stands before the colon of the first line, and how often it was said. */
const times = (text: string, what: RegExp) => text.match(new RegExp(what, 'g'))?.length ?? 0

test('(10) a second coordinator of the same record is refused by name with 77, and the first goes on', async () => {
  server = await RedisServer.start()
  const first = bench.run('records/one', ['--redis', server.url])
  await hears(first, /No worker is here/)
  const second = await bench.run('records/one', ['--redis', server.url]).ended
  expect(second.code, second.out).toBe(77)
  const { refused } = JSON.parse(second.out) as { refused: { code: string; message: string } }
  expect(refused.code).toBe('record-in-use')
  expect(second.out).toContain(String(first.pid))
  expect(first.isOver).toBe(false)
  bench.work(server.url, 'h1')
  expect((await first.ended).code).toBe(0)
})

test('a worker with a key runs nothing unsigned: said once, 77 when there is nothing else to do', async () => {
  server = await RedisServer.start()
  bench.write('site.key', randomBytes(32).toString('hex'))
  chmodSync(join(bench.folder, 'site.key'), 0o600)
  bench.run('records/unsigned', ['--redis', server.url])
  const worker = await bench.work(server.url, 'h1', ['--key', 'site.key']).ended
  expect(worker.code, worker.out + worker.err).toBe(77)
  expect(times(worker.out + worker.err, /not signed with the key of this site/)).toBeLessThanOrEqual(2)
  expect(times(worker.out + worker.err, /not signed/)).toBeGreaterThan(0)
  // Signed with that key, the same search is served.
  bench.write('search.yaml', searchOf(200, 'signed'))
  const signed = bench.run('records/signed', ['--redis', server.url, '--key', 'site.key'])
  await hears(signed, /No worker is here/)
  bench.work(server.url, 'h1', ['--key', 'site.key'])
  const { code, err } = await signed.ended
  expect(code, err).toBe(0)
})

test('(24) a wrong password ends worker and coordinator with 77 after a handful of connections', async () => {
  server = await RedisServer.start(['--requirepass', 'right'])
  const url = server.url.replace('//', '//:canary@')
  const lives = [bench.work(url, 'h1'), bench.run('records/wrong', ['--redis', url])]
  for (const life of lives) {
    const { code, out, err } = await life.ended
    expect(code, out + err).toBe(77)
    expect(out + err).toContain('user or password is wrong')
    expect(out + err).not.toContain('canary')
  }
  const stats = server.ask('-a', 'right', '--no-auth-warning', 'INFO', 'stats')
  expect(Number(/total_connections_received:(\d+)/.exec(stats)?.[1])).toBeLessThan(15)
})

test('a genome beyond what may travel is refused before anything is sent, with what to do', async () => {
  server = await RedisServer.start()
  bench.write('problem.js', waitingProblem(1).replace('length: 4', 'length: 200000'))
  const { code, out } = await bench.run('records/huge', ['--redis', server.url]).ended
  expect(code, out).toBe(78)
  expect(out).toMatch(/200000|100000|100,000/)
  expect(server.ask('KEYS', '*')).toBe('')
})

test('(19) healthy but idle: with work waiting that it never gets, a worker leaves with 69 and says so', async () => {
  // Not smaller: a moment in which the search is not announced in time starts the minute again.
  const site = await Site.open(0.25)
  try {
    site.announcement = { ...site.announcement, waiting: true }
    const worker = site.worker('host-a')
    expect(await worker.gone).toBe(69)
    expect(worker.out + worker.err).toMatch(/Work has been waiting .* this worker got none/)
  } finally {
    await site.close()
  }
})

test('over TLS, with a certificate of the site, the search has the digest of one machine', async () => {
  const [key, certificate] = [join(bench.folder, 'key.pem'), join(bench.folder, 'certificate.pem')]
  const made = [
    'req',
    '-x509',
    '-newkey',
    'rsa:2048',
    '-nodes',
    '-days',
    '2',
    '-subj',
    '/CN=queue of the works',
  ]
  execFileSync(
    'openssl',
    [...made, '-addext', 'subjectAltName=IP:127.0.0.1', '-keyout', key, '-out', certificate],
    { stdio: 'ignore' },
  )
  const port = await freePort()
  const tls = ['--tls-port', `${port}`, '--tls-cert-file', certificate, '--tls-key-file', key]
  server = await RedisServer.start([...tls, '--tls-ca-cert-file', certificate, '--tls-auth-clients', 'no'])
  const url = `rediss://127.0.0.1:${port}`
  // Without the certificate: refused, once, no plain text is tried.
  const stranger = await bench.work(url, 'h0').ended
  expect(stranger.code, stranger.err).toBe(78)
  expect(stranger.err).toContain('SKERRY_REDIS_CA')
  const known = { SKERRY_REDIS_CA: certificate }
  bench.work(url, 'h1', [], known)
  const safe = await bench.run('records/tls', ['--redis', url], known).ended
  expect(safe.code, safe.err).toBe(0)
  const alone = await bench.run('records/alone', ['--cores', '1']).ended
  expect(reportOf(safe.out)).toEqual(reportOf(alone.out))
})
