// What this machine needs before better-sqlite3 can be installed, as a table: one row a piece, with the way to
// see it and the cure for each system.
//
// better-sqlite3 comes prebuilt for the usual systems; npm fetches that binary when it may. Where it cannot be
// fetched npm compiles it with node-gyp, and then Python 3, make, a C and a C++20 compiler and the headers of
// this very Node are needed. All that is looked at comes in through `world`, so that tests can lack anything.
// Plain JavaScript, because it runs before anything is installed or built.

/**
 * @typedef {object} World
 * @property {NodeJS.ProcessEnv} env
 * @property {string} platform
 * @property {string} nodeVersion e.g. '20.19.0'
 * @property {string} prefix folder above the folder of the Node program
 * @property {string} headerCache node-gyp's folder of headers for this Node
 * @property {string | undefined} builtInPrefix where this Node itself says that its headers are
 * @property {string} osRelease text of /etc/os-release, or ''
 * @property {(path: string) => string | undefined} read text of a file, undefined when there is none
 * @property {(command: string, args: string[], input?: string) => string | undefined} run
 *   what a command printed, undefined when it is missing or failed
 * @property {() => Promise<boolean>} headersCanBeFetched
 * @property {() => boolean} prebuiltCanBeHad
 */

export const oldestNode = [20, 19]
const oldestPython = [3, 8]

/** @param {string} text @param {number[]} oldest */
function atLeast(text, oldest) {
  const found = text.split('.').map(Number)
  for (const [place, least] of oldest.entries()) {
    const part = found[place] ?? 0
    if (part !== least) return part > least
  }
  return true
}

/** @param {World} world */
function python(world) {
  const asked = [world.env.npm_config_python, world.env.PYTHON].filter((name) => name !== undefined)
  return [...asked, 'python3', 'python'].some((name) => {
    const version = world.run(name, ['-c', 'import sys; print("%d.%d" % sys.version_info[:2])'])
    return version !== undefined && atLeast(version.trim(), oldestPython)
  })
}

/**
 * A variable such as CXX may hold a launcher and options ('ccache g++').
 * @param {string | undefined} asked @param {string} usual
 */
function words(asked, usual) {
  const [command = usual, ...rest] = (asked ?? usual).split(' ').filter((word) => word !== '')
  return { command, rest }
}

/** @param {World} world */
function cCompiler(world) {
  const { command, rest } = words(world.env.CC, 'cc')
  return world.run(command, [...rest, '-fsyntax-only', '-x', 'c', '-'], 'int answer;\n') !== undefined
}

/** @param {World} world */
function cxxCompiler(world) {
  const usual = world.platform === 'darwin' ? 'c++' : 'g++'
  const { command, rest } = words(world.env.CXX, usual)
  const source = '#include <string>\nstruct P { int x; };\nconstexpr P p{.x = 1};\nstd::string s;\n'
  return world.run(command, [...rest, '-std=c++20', '-fsyntax-only', '-x', 'c++', '-'], source) !== undefined
}

/**
 * Whether a folder holds the headers of exactly this Node.
 * @param {World} world @param {string} prefix
 */
export function holdsHeaders(world, prefix) {
  const text = world.read(`${prefix}/include/node/node_version.h`)
  if (text === undefined) return false
  const numbers = ['MAJOR', 'MINOR', 'PATCH'].map(
    (part) => new RegExp(`^#define NODE_${part}_VERSION (\\d+)`, 'm').exec(text)?.[1],
  )
  return numbers.join('.') === world.nodeVersion
}

/**
 * Where the build will find Node's headers: 'known' (npm or node-gyp finds them unaided), 'beside' (they lie
 * beside the Node program but node-gyp does not look there), 'fetch', or 'nowhere'.
 * @param {World} world
 */
export async function findHeaders(world) {
  const asked = world.env.npm_config_nodedir
  if (asked) {
    const inSources = world.read(`${asked}/src/node_version.h`) !== undefined
    return inSources || holdsHeaders(world, asked) ? 'known' : 'nowhere'
  }
  if (world.builtInPrefix !== undefined && holdsHeaders(world, world.builtInPrefix)) return 'known'
  if (holdsHeaders(world, world.headerCache) && world.read(`${world.headerCache}/installVersion`))
    return 'known'
  if (holdsHeaders(world, world.prefix)) return 'beside'
  return (await world.headersCanBeFetched()) ? 'fetch' : 'nowhere'
}

/** @typedef {{ piece: string, debian: string, fedora: string, macos: string }} Cure */

/** @type {(Cure & { found: (world: World) => boolean })[]} */
const tools = [
  {
    piece: 'Python 3.8 or newer',
    found: python,
    debian: 'apt-get install python3',
    fedora: 'dnf install python3',
    macos: 'xcode-select --install',
  },
  {
    piece: 'make',
    found: (world) => world.run(world.env.MAKE ?? 'make', ['--version']) !== undefined,
    debian: 'apt-get install make',
    fedora: 'dnf install make',
    macos: 'xcode-select --install',
  },
  {
    piece: 'a C compiler (cc)',
    found: cCompiler,
    debian: 'apt-get install gcc',
    fedora: 'dnf install gcc',
    macos: 'xcode-select --install',
  },
  {
    piece: 'a C++ compiler that knows C++20 (g++ 10 or newer)',
    found: cxxCompiler,
    debian: 'apt-get install g++',
    fedora: 'dnf install gcc-c++',
    macos: 'xcode-select --install',
  },
]

/** @type {(world: World) => Cure} */
const headers = (world) => {
  const version = world.nodeVersion
  const unpack = `unpack node-v${version}-headers.tar.gz from Node's download page and run: npm_config_nodedir=FOLDER npm ci`
  const asked = world.env.npm_config_nodedir
  const wrong = asked ? ` (npm's setting nodedir=${asked} has none of that version)` : ''
  return {
    piece: `the headers of Node ${version} (node_version.h)${wrong}`,
    debian: `apt-get install libnode-dev if Node is Debian's own; otherwise ${unpack}`,
    fedora: `dnf install nodejs-devel if Node is Fedora's own; otherwise ${unpack}`,
    macos: unpack,
  }
}

/**
 * One line for a person: the piece and its cure on this system, or on all three when the system is unknown.
 * @param {World} world @param {Cure} row
 */
export function lineFor(world, row) {
  const like = /^ID(?:_LIKE)?=.*$/gm
  const names = (world.osRelease.match(like) ?? []).join(' ')
  if (world.platform === 'darwin') return `missing: ${row.piece}. Cure: ${row.macos}`
  if (/debian|ubuntu/.test(names)) return `missing: ${row.piece}. Cure (as root): ${row.debian}`
  if (/fedora|rhel/.test(names)) return `missing: ${row.piece}. Cure (as root): ${row.fedora}`
  return `missing: ${row.piece}. Cure: Debian, Ubuntu: ${row.debian}; Fedora: ${row.fedora}; macOS: ${row.macos}`
}

/**
 * What is missing, one line a piece; empty when the install can go on. `seedHeaders` is true when headers
 * beside the Node program should be put where node-gyp looks.
 * @param {World} world
 * @returns {Promise<{ lines: string[], seedHeaders: boolean }>}
 */
export async function inspect(world) {
  if (!atLeast(world.nodeVersion, oldestNode)) {
    const line = `missing: Node ${oldestNode.join('.')} or newer (this is ${world.nodeVersion}). Cure: install a current long-term release of Node`
    return { lines: [line], seedHeaders: false }
  }
  // Windows: node-gyp's own messages name what Visual Studio lacks; nothing is guessed here.
  if (world.platform === 'win32') return { lines: [], seedHeaders: false }
  const missing = tools.filter((tool) => !tool.found(world)).map((tool) => lineFor(world, tool))
  const where = await findHeaders(world)
  if (where === 'nowhere') missing.push(lineFor(world, headers(world)))
  if (missing.length > 0 && world.prebuiltCanBeHad()) return { lines: [], seedHeaders: false }
  return { lines: missing, seedHeaders: missing.length === 0 && where === 'beside' }
}
