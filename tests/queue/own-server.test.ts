// A Redis of the coordinator's own: it is found, it is closed to strangers, it comes back, and it never outlives us.

import { execFileSync, spawn } from 'node:child_process'
import { readdirSync, readFileSync } from 'node:fs'
import { afterEach, expect, test } from 'vitest'
import { type OwnServer, startOwnServer } from '../../worker/redis/own-server.js'

const servers: OwnServer[] = []
afterEach(async () => {
  for (const server of servers.splice(0)) await server.close()
})

/** Runs redis-cli against a URL and gives what it prints. */
function ask(url: string, ...words: string[]): string {
  const { port, username, password } = new URL(url)
  const login = username === '' ? [] : ['--user', username, '--pass', password, '--no-auth-warning']
  return execFileSync('redis-cli', ['-h', '127.0.0.1', '-p', port, ...login, ...words], {
    encoding: 'utf8',
  }).trim()
}

async function started(restarted: (why: string) => void = () => {}): Promise<OwnServer> {
  const server = await startOwnServer({
    address: '127.0.0.1',
    bindAddressOnly: true,
    prefix: 'skerry',
    restarted,
    lost: (refusal) => {
      throw refusal
    },
  })
  servers.push(server)
  return server
}

function processOf(port: number): number {
  const pid = readdirSync('/proc')
    .filter((name) => /^\d+$/.test(name))
    .find((name) => {
      try {
        return readFileSync(`/proc/${name}/cmdline`, 'utf8').includes(`redis-server 127.0.0.1:${port}`)
      } catch {
        return false
      }
    })
  return Number(pid ?? 0)
}

test('strangers, and workers beyond what they need, are refused', async () => {
  const { coordinatorUrl, workerUrl, port } = await started()
  expect(ask(`redis://127.0.0.1:${port}`, 'PING')).toContain('NOAUTH')
  expect(ask(coordinatorUrl, 'PING')).toBe('PONG')
  expect(ask(coordinatorUrl, 'CONFIG', 'GET', 'maxmemory-policy')).toContain('noeviction')
  expect(ask(coordinatorUrl, 'SET', 'skerry:s:a:plugin', 'pinned')).toBe('OK')
  expect(ask(workerUrl, 'GET', 'skerry:s:a:plugin')).toBe('pinned')
  expect(ask(workerUrl, 'XADD', 'skerry:s:a:results', '*', 'b', 'x')).toMatch(/^\d+-\d+$/)
  for (const words of [
    ['SET', 'skerry:s:a:plugin', 'forged'],
    ['SET', 'other', 'x'],
    ['HSET', 'skerry:searches', 'a', 'forged'],
    ['FLUSHALL'],
    ['FLUSHDB'],
    ['KEYS', '*'],
    ['CONFIG', 'GET', '*'],
    ['CONFIG', 'SET', 'dir', '/'],
    ['ACL', 'LIST'],
    ['SHUTDOWN'],
    ['CLIENT', 'KILL', 'TYPE', 'normal'],
  ])
    expect(ask(workerUrl, ...words), words.join(' ')).toContain('NOPERM')
  for (const words of [['FLUSHALL'], ['KEYS', '*'], ['CONFIG', 'SET', 'dir', '/'], ['SET', 'other', 'x']])
    expect(ask(coordinatorUrl, ...words), words.join(' ')).toContain('NOPERM')
  expect(ask(coordinatorUrl, 'GET', 'skerry:s:a:plugin')).toBe('pinned')
})

test('a server that is killed comes back, empty, at the same place', async () => {
  const told: string[] = []
  const { coordinatorUrl, port } = await started((why) => told.push(why))
  ask(coordinatorUrl, 'SET', 'skerry:x', '1')
  const pid = processOf(port)
  expect(pid).toBeGreaterThan(0)
  process.kill(pid, 'SIGKILL')
  await expect.poll(() => told.length, { timeout: 15_000 }).toBe(1)
  expect(ask(coordinatorUrl, 'EXISTS', 'skerry:x')).toBe('0')
  expect(processOf(port)).not.toBe(pid)
})

test('it ends with a parent that is killed', async () => {
  const script = `
    import { startOwnServer } from '${new URL('../../dist/worker/redis/own-server.js', import.meta.url).href}'
    const server = await startOwnServer({ address: '127.0.0.1', bindAddressOnly: true, prefix: 'skerry', restarted() {}, lost() {} })
    console.log(server.port)
    setInterval(() => {}, 1000)`
  const parent = spawn(process.execPath, ['--input-type=module', '-e', script], {
    stdio: ['ignore', 'pipe', 'inherit'],
  })
  const port = await new Promise<number>((resolve) =>
    parent.stdout.once('data', (bytes) => resolve(Number(bytes))),
  )
  expect(processOf(port)).toBeGreaterThan(0)
  parent.kill('SIGKILL')
  await expect.poll(() => processOf(port), { timeout: 15_000 }).toBe(0)
})

test('without redis-server the refusal says what to install', async () => {
  await expect(
    startOwnServer({
      address: '127.0.0.1',
      bindAddressOnly: true,
      prefix: 'skerry',
      program: 'no-such-redis-server',
      restarted() {},
      lost() {},
    }),
  ).rejects.toMatchObject({
    code: 'queue-unreachable',
    cure: expect.stringContaining('apt-get install redis-server'),
  })
})
