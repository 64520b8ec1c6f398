// A plug-in that does whatever its genome says, good or bad; bundled by the tests, never imported by them.

import { choice, defineProblem, real } from 'skerry'

/** A plug-in has no business with these; this one wants trouble. */
const host = globalThis as unknown as {
  process: { exit(code: number): never; pid: number; kill(pid: number, signal: string): never }
  setTimeout(work: () => void, ms: number): void
  console: { log(text: string): void; error(text: string): void }
}

const deeds: { readonly [deed: string]: (x: number) => number } = {
  well: (x) => x,
  slow: (x) => {
    let sum = x
    for (let i = 0; i < 2e6; i++) sum += Math.sqrt(i)
    return sum
  },
  loop: (x) => {
    let sum = x
    while (sum < Infinity) sum = sum > 1e9 ? x : sum + 1
    return sum
  },
  exit: () => host.process.exit(3),
  heap: () => {
    const eaten: number[][] = []
    for (;;) eaten.push(Array.from({ length: 1000 }, (_, i) => i + eaten.length))
  },
  arrays: (x) => {
    const eaten: Float64Array[] = []
    while (eaten.length < 160) {
      eaten.push(new Float64Array(2 ** 21).fill(x + eaten.length))
      for (let i = 0; i < 4e6; i++) x += Math.sqrt(i)
    }
    return x + eaten.length
  },
  /** One list that grows: V8 asks for its memory in one piece and ends the whole process when it gets none. */
  large: (x) => {
    const eaten: { readonly x: number }[] = []
    for (let i = 0; i < 2 ** 27; i++) eaten.push({ x: x + i })
    return eaten.length
  },
  abort: () => host.process.kill(host.process.pid, 'SIGSEGV'),
  throw: () => {
    throw new RangeError('the pump ran dry')
  },
  deep: (x) => deeds.deep!(x + 1) + 1,
  nan: () => Number.NaN,
  print: (x) => {
    const line = 'junk '.repeat(20_000)
    for (let i = 0; i < 500; i++) {
      host.console.log(line)
      host.console.error(line)
    }
    return x
  },
  'throw-later': (x) => {
    host.setTimeout(() => {
      throw new Error('too late')
    }, 0)
    return x
  },
  'last-words': () => {
    host.console.error('the valve is stuck')
    return host.process.exit(4)
  },
  pid: () => host.process.pid,
}

export default defineProblem({
  name: 'troublemaker',
  version: '1',
  summary: 'Does whatever its genome says; only for tests.',
  genome: { deed: choice({ options: Object.keys(deeds) }), x: real({ length: 3, low: 0.1, high: 1 }) },
  objectives: { value: { direction: 'maximise', unit: '1' }, other: { direction: 'minimise', unit: '1' } },
  measures: { sine: { low: -1, high: 1, unit: '1' } },
  cases: ['idle', 'full-speed'],
  drawCondition: (stream) => ({ friction: stream.normal() }),
  simulate: (genome, situations) => {
    const deed = Object.values(deeds)[genome.deed[0]!]!
    return situations.map(({ condition, case: name }) => {
      const x = genome.x[0]! + condition.friction * genome.x[1]! + (name === 'idle' ? 0 : genome.x[2]! ** 1.3)
      return { objectives: { value: deed(x), other: Math.exp(x) }, measures: { sine: Math.sin(x) } }
    })
  },
})
