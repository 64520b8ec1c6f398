import { expect, test } from 'vitest'
import { cures, findService, services } from './services.mjs'

type World = Parameters<typeof findService>[1]

/** A machine on which `programs` are there, and which remembers what it was told and made to do. */
function machine(programs: string[], change: Partial<World> = {}) {
  const said: string[] = []
  const world: World = {
    env: { PATH: ['', 'opt', 'bin'].join('/') },
    cache: '/cache',
    root: false,
    debian: true,
    runs: (path) => programs.includes(path),
    install: () => false,
    unpack: () => false,
    fetch: () => false,
    say: (line) => said.push(line),
    ...change,
  }
  return { world, said }
}

test('the environment variable wins over PATH, PATH over the cache', () => {
  const all = ['/own/redis', '/opt/bin/redis-server', '/cache/redis-server/run']
  const env = { PATH: '/opt/bin', SKERRY_REDIS_SERVER: '/own/redis' }
  expect(findService('redis-server', machine(all, { env }).world)).toBe('/own/redis')
  expect(findService('redis-server', machine(all).world)).toBe('/opt/bin/redis-server')
  expect(findService('redis-server', machine(all.slice(2)).world)).toBe('/cache/redis-server/run')
})

test('a variable that names no program is said, and nothing is put in its place', () => {
  const env = { PATH: '/opt/bin', SKERRY_CHROMIUM: '/gone' }
  const { world, said } = machine(['/opt/bin/chromium'], { env })
  expect(findService('chromium', world)).toBeUndefined()
  expect(said).toEqual(['SKERRY_CHROMIUM names /gone, which is no program that can be run'])
})

test('as root on Debian it is installed, and said', () => {
  const programs: string[] = []
  const install = (name: string) => programs.push(`/opt/bin/${name}`) > 0
  const { world, said } = machine(programs, { root: true, install })
  expect(findService('chromium', world)).toBe('/opt/bin/chromium')
  expect(said).toEqual(['chromium is not here: installing the package chromium with apt-get (as root)'])
})

test('without root redis-server is unpacked into the cache, and said; chromium is not', () => {
  const programs: string[] = []
  const unpack = (_name: string, _packages: string[], folder: string) => programs.push(`${folder}/run`) > 0
  const { world, said } = machine(programs, { unpack })
  expect(findService('chromium', world)).toBeUndefined()
  expect(findService('redis-server', world)).toBe('/cache/redis-server/run')
  expect(said).toHaveLength(1)
  expect(said[0]).toContain('unpacking its Debian packages into /cache/redis-server')
})

test('elsewhere than on Debian nothing is installed', () => {
  const install = () => {
    throw new Error('installed')
  }
  const { world } = machine([], { debian: false, root: true, install, unpack: install })
  expect(findService('redis-server', world)).toBeUndefined()
})

test('an install that fails leaves the service missing', () => {
  expect(findService('chromium', machine([], { root: true }).world)).toBeUndefined()
})

test('another Node is fetched into a folder of its version, on any system and as anybody, and said', () => {
  for (const root of [true, false]) {
    const programs: string[] = []
    const fetch = (_: unknown, folder: string) => programs.push(`${folder}/run`) > 0
    const { world, said } = machine(programs, { debian: false, root, fetch })
    const found = findService('node-22', world)
    expect(found).toMatch(/^\/cache\/node-22-22\.\d+\.\d+\/run$/)
    expect(said).toHaveLength(1)
    expect(said[0]).toMatch(/^node-22 is not here: unpacking node-linux-\w+@22\./)
    expect(findService('node-22', world)).toBe(found)
    expect(said).toHaveLength(1)
  }
  expect(findService('node-22', machine([]).world)).toBeUndefined()
})

test('the cure names the way with root, the way without, and the way to accept', () => {
  for (const [name, row] of Object.entries(services)) {
    const text = cures(name).join('\n')
    if ('fetch' in row) expect(text).toContain(`npm pack ${row.fetch.npm}`)
    else expect(text).toContain(`With root: apt-get install ${row.apt}`)
    expect(text).toMatch(new RegExp(`without(?: root)?: set ${row.variable}`))
    expect(text).toContain(`npm test -- --without ${name}`)
  }
})
