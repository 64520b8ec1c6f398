import { expect, test } from 'vitest'
import { findHeaders, inspect, lineFor } from '../../coordinator/setup/pieces.mjs'

type World = Parameters<typeof inspect>[0]

const version = '20.19.0'
const header = '#define NODE_MAJOR_VERSION 20\n#define NODE_MINOR_VERSION 19\n#define NODE_PATCH_VERSION 0\n'
const debian = 'PRETTY_NAME="Some"\nID=debian\n'

/** A machine with everything but what `lacks` names, no prebuilt binary, and headers only as `files` says. */
function machine(lacks: string[], change: Partial<World> = {}, files: Record<string, string> = {}): World {
  return {
    env: { npm_config_nodedir: '/usr' },
    platform: 'linux',
    nodeVersion: version,
    prefix: '/opt/node',
    headerCache: '/cache/node-gyp/20.19.0',
    builtInPrefix: undefined,
    osRelease: debian,
    read: (path) => ({ '/usr/include/node/node_version.h': header, ...files })[path],
    run: (command, args) => (lacks.includes(command) ? undefined : args[0] === '-c' ? '3.11\n' : 'ok'),
    headersCanBeFetched: async () => false,
    prebuiltCanBeHad: () => false,
    ...change,
  }
}

test('a machine with everything hears nothing, and no binary is fetched to find out', async () => {
  const prebuiltCanBeHad = () => {
    throw new Error('asked for the binary')
  }
  expect(await inspect(machine([], { prebuiltCanBeHad }))).toEqual({ lines: [], seedHeaders: false })
})

test.each([
  [['python3', 'python'], 'Python 3.8', 'apt-get install python3'],
  [['make'], 'make', 'apt-get install make'],
  [['cc'], 'a C compiler', 'apt-get install gcc'],
  [['g++'], 'a C++ compiler', 'apt-get install g++'],
])('without %s one line says so and names the cure', async (lacks, piece, cure) => {
  const { lines } = await inspect(machine(lacks))
  expect(lines).toHaveLength(1)
  expect(lines[0]).toContain(`missing: ${piece}`)
  expect(lines[0]).toContain(cure)
})

test('each missing piece has a line of its own', async () => {
  const { lines } = await inspect(machine(['python3', 'python', 'make', 'cc', 'g++'], { env: {} }))
  expect(lines).toHaveLength(5)
})

test('nothing is missing where the prebuilt binary can be had', async () => {
  const world = machine(['make', 'g++'], { prebuiltCanBeHad: () => true })
  expect(await inspect(world)).toEqual({ lines: [], seedHeaders: false })
})

test('an old Node is named first, with the version that is needed', async () => {
  const { lines } = await inspect(machine(['make'], { nodeVersion: '20.18.3' }))
  expect(lines).toHaveLength(1)
  expect(lines[0]).toContain('Node 20.19 or newer (this is 20.18.3)')
})

test('an old Python is as good as none', async () => {
  const run: World['run'] = (_command, args) => (args[0] === '-c' ? '3.7\n' : 'ok')
  expect((await inspect(machine([], { run }))).lines[0]).toContain('Python 3.8')
})

test('a nodedir that holds headers of another Node is named, not trusted', async () => {
  const old = header.replace('19', '18')
  const world = machine([], {}, { '/usr/include/node/node_version.h': old })
  const { lines } = await inspect(world)
  expect(lines).toHaveLength(1)
  expect(lines[0]).toContain("npm's setting nodedir=/usr has none of that version")
})

test('headers are looked for where node-gyp looks, then beside Node, then for download', async () => {
  const bare = { env: {} }
  expect(await findHeaders(machine([], bare))).toBe('nowhere')
  expect(await findHeaders(machine([], { ...bare, headersCanBeFetched: async () => true }))).toBe('fetch')
  expect(await findHeaders(machine([], { ...bare, builtInPrefix: '/usr' }))).toBe('known')
  const beside = { '/opt/node/include/node/node_version.h': header }
  expect(await findHeaders(machine([], bare, beside))).toBe('beside')
  expect(await inspect(machine([], bare, beside))).toEqual({ lines: [], seedHeaders: true })
  const cached = {
    '/cache/node-gyp/20.19.0/include/node/node_version.h': header,
    '/cache/node-gyp/20.19.0/installVersion': '11\n',
  }
  expect(await findHeaders(machine([], bare, cached))).toBe('known')
})

test('the cure is that of the system; an unknown system hears of all three', () => {
  const row = { piece: 'make', debian: 'A', fedora: 'B', macos: 'C' }
  const on = (change: Partial<World>) => lineFor(machine([], change), row)
  expect(on({})).toBe('missing: make. Cure (as root): A')
  expect(on({ osRelease: 'ID=pop\nID_LIKE="ubuntu debian"\n' })).toBe('missing: make. Cure (as root): A')
  expect(on({ osRelease: 'ID=rocky\nID_LIKE="rhel centos fedora"\n' })).toBe(
    'missing: make. Cure (as root): B',
  )
  expect(on({ platform: 'darwin', osRelease: '' })).toBe('missing: make. Cure: C')
  expect(on({ osRelease: 'ID=other\n' })).toBe('missing: make. Cure: Debian, Ubuntu: A; Fedora: B; macOS: C')
})
