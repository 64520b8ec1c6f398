// What every dispatcher must do, whatever carries its work. An adapter runs this suite with a factory of its own.

import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { afterAll, afterEach, beforeAll, describe, expect, test } from 'vitest'
import type { Dispatcher } from '../../coordinator/engine/ports.js'
import { equalBytes, resultDigest } from '../../shared/digests.js'
import { genomeBytes, genomeFromBytes } from '../../shared/encodings.js'
import { idOf } from '../../shared/ids.js'
import type { AnyProblem } from '../../shared/problem.js'
import type { DispatchFact, EvaluationResult, WorkItem } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { evaluate } from '../../sim/evaluate.js'
import { bundlePlugin } from '../../worker/plugin/bundle.js'
import { loadPlugin } from '../../worker/plugin/load.js'
import { ensureBuilt } from '../tools/built.js'

export interface DispatcherSetting {
  readonly pluginFile: string
  readonly seed: number
  readonly sharedConditions: boolean
  readonly slots: number
  /** Wall seconds a simulation may take at least before it is given up. */
  readonly leastSeconds: number
  readonly unmeasuredSeconds: number
  readonly megabytes: number
}
/** A dispatcher; after start() it has its slots. */
export type MakeDispatcher = (setting: DispatcherSetting) => Dispatcher

type Result = Extract<DispatchFact, { kind: 'result' }>
type Lost = Extract<DispatchFact, { kind: 'lost' }>
/** What an item is answered with; who is there is told beside it. */
type AnswerFact = Result | Lost

const seed = 20261201
let folder: string
let pluginFile: string
let problem: AnyProblem

async function prepare(): Promise<void> {
  ensureBuilt()
  folder = mkdtempSync(join(tmpdir(), 'skerry-dispatcher-'))
  pluginFile = join(folder, 'plugin.mjs')
  const source = join(dirname(fileURLToPath(import.meta.url)), 'troublemaker.ts')
  const { code } = await bundlePlugin(source)
  writeFileSync(pluginFile, code)
  problem = await loadPlugin({ code })
}

/** Item `evaluation` of island 1; its genome follows from its number. */
function itemOf(evaluation: number, deed = 'well', more: Partial<WorkItem> = {}): WorkItem {
  const encoding = problem.genome.deed
  const options = encoding?.kind === 'choice' ? encoding.options : []
  const draws = stream(seed, 'check', 1, evaluation)
  const x = Float64Array.from({ length: 3 }, () => 0.1 + 0.9 * draws.uniform())
  const genome = genomeBytes(problem.genome, { deed: Int32Array.of(options.indexOf(deed)), x })
  return {
    island: 1,
    evaluation,
    individual: idOf(1, evaluation),
    firstReplicate: evaluation % 3,
    replicates: 1 + (evaluation % 4),
    genome,
    expectedCost: 1,
    attempt: 1,
    purpose: 'evaluate',
    isolation: 'shared',
    avoid: [],
    ...more,
  }
}

/** What the item must give: simulated here. */
function expected(item: WorkItem): EvaluationResult {
  const genome = genomeFromBytes(problem.genome, item.genome)
  return evaluate(problem, genome, seed, false, item.individual, item.firstReplicate, item.replicates)
}

function isAnswer(fact: DispatchFact): fact is AnswerFact {
  return fact.kind !== 'fleet'
}
function isResult(fact: DispatchFact): fact is Result {
  return fact.kind === 'result'
}
function isLost(fact: DispatchFact): fact is Lost {
  return fact.kind === 'lost'
}

/** Submits all and collects until each item has been answered, or fails after `seconds`. */
async function run(dispatcher: Dispatcher, items: readonly WorkItem[], seconds = 60): Promise<AnswerFact[]> {
  const key = ({ evaluation, purpose, attempt }: AnswerFact['item']) => `${evaluation}/${purpose}/${attempt}`
  const missing = new Set(items.map(key))
  const facts: AnswerFact[] = []
  const untilMs = performance.now() + seconds * 1000
  dispatcher.submit(items)
  while (missing.size > 0) {
    if (performance.now() > untilMs) throw new Error(`not answered: ${[...missing].slice(0, 10).join(', ')}`)
    for (const fact of (await dispatcher.facts(200)).filter(isAnswer)) {
      facts.push(fact)
      missing.delete(key(fact.item))
    }
  }
  return facts
}

/** Every result among the facts is the one of evaluate() here, bit for bit. */
function expectExact(facts: readonly DispatchFact[], items: readonly WorkItem[]): void {
  const byNumber = new Map(items.map((item) => [item.evaluation, item]))
  for (const { item, result, digest } of facts.filter(isResult)) {
    const here = expected(byNumber.get(item.evaluation)!)
    expect(equalBytes(digest, resultDigest(here)), `evaluation ${item.evaluation}`).toBe(true)
    expect(result.values).toEqual(here.values)
    expect(result.failures).toEqual(here.failures)
  }
}

function isAlive(pid: number): boolean {
  try {
    process.kill(pid, 0)
    return true
  } catch {
    return false
  }
}

/** Parts of the contract, so that a suite can be spread over several files. */
export const contractParts = { answering, surviving, isolating, closing }

export function dispatcherContract(
  name: string,
  make: MakeDispatcher,
  parts: readonly (keyof typeof contractParts)[],
): void {
  describe(`dispatcher ${name}`, () => {
    let open: Dispatcher[] = []
    beforeAll(prepare, 60_000)
    afterAll(() => rmSync(folder, { recursive: true, force: true }))
    afterEach(async () => {
      await Promise.all(open.map((dispatcher) => dispatcher.close()))
      open = []
    })

    async function started(more: Partial<DispatcherSetting> = {}): Promise<Dispatcher> {
      const setting = {
        pluginFile,
        seed,
        sharedConditions: false,
        slots: 2,
        leastSeconds: 30,
        unmeasuredSeconds: 30,
      }
      const dispatcher = make({ ...setting, megabytes: 128, ...more })
      open.push(dispatcher)
      await dispatcher.start()
      return dispatcher
    }

    for (const part of parts) contractParts[part](started)
  })
}

type Started = (more?: Partial<DispatcherSetting>) => Promise<Dispatcher>
const numbers = (count: number, from = 1): number[] => Array.from({ length: count }, (_, i) => from + i)

function answering(started: Started): void {
  test.each([1, 2, 7])('with %i slots every item is answered with the bits of evaluate()', async (slots) => {
    const dispatcher = await started({ slots })
    const items = numbers(400).map((n) => itemOf(n))
    const facts = await run(dispatcher, items)
    expect(facts.filter(isLost)).toEqual([])
    expect(new Set(facts.map(({ item }) => item.evaluation)).size).toBe(400)
    expectExact(facts, items)
    expect(
      facts.filter(isResult).every(({ cpuSeconds, wallSeconds }) => cpuSeconds >= 0 && wallSeconds > 0),
    ).toBe(true)
  })

  test('says how much more it wants, and what is outstanding', async () => {
    const dispatcher = await started()
    const before = dispatcher.status()
    expect(before.slots).toBe(2)
    expect(before.outstanding).toBe(0)
    expect(before.wanted).toBeGreaterThanOrEqual(before.slots)
    const items = numbers(50).map((n) => itemOf(n))
    dispatcher.submit(items.slice(1))
    expect(dispatcher.status()).toMatchObject({ outstanding: 49, wanted: 0 })
    const facts: AnswerFact[] = []
    while (facts.length < 49) facts.push(...(await dispatcher.facts(200)).filter(isAnswer))
    expect(dispatcher.status().outstanding).toBe(0)
    expect(dispatcher.status().wanted).toBeGreaterThanOrEqual(2)
  })

  test('facts() returns empty-handed when nothing happens in time', async () => {
    const dispatcher = await started()
    expect(await dispatcher.facts(20)).toEqual([])
  })

  test('work may come while work is done, in any portions', async () => {
    const dispatcher = await started()
    const items = numbers(200).map((n) => itemOf(n))
    const facts: DispatchFact[] = []
    let next = 0
    while (facts.length < items.length) {
      dispatcher.submit(items.slice(next, next + 1 + (next % 7)))
      next = Math.min(items.length, next + 1 + (next % 7))
      facts.push(...(await dispatcher.facts(5)))
    }
    expectExact(facts, items)
  })
}

function surviving(started: Started): void {
  const good = numbers(120, 100).map((n) => [n, 'well'] as const)

  /** Runs the bad item among good ones; all good ones must be answered well. Gives the facts of the bad one. */
  async function among(dispatcher: Dispatcher, deed: string): Promise<AnswerFact> {
    const plan = [...good.slice(0, 60), [1, deed] as const, ...good.slice(60)]
    const items = plan.map(([n, what]) => itemOf(n, what))
    const facts = await run(dispatcher, items)
    const others = facts.filter(({ item }) => item.evaluation !== 1)
    expect(others.filter(isLost)).toEqual([])
    expectExact(others, items)
    const own = facts.filter(({ item }) => item.evaluation === 1)
    expect(own.length).toBe(1)
    return own[0]!
  }

  test('an endless simulation is lost by its time limit, and nobody else', async () => {
    const dispatcher = await started({ leastSeconds: 1, unmeasuredSeconds: 5 })
    expect(await among(dispatcher, 'loop')).toMatchObject({ kind: 'lost', cause: 'time-limit' })
  })

  test('one that ends its thread is lost as died, and nobody else', async () => {
    const fact = await among(await started(), 'exit')
    expect(fact).toMatchObject({ kind: 'lost', cause: 'died', item: { evaluation: 1, isolation: 'shared' } })
  })

  test('its last words are kept', async () => {
    const fact = await among(await started(), 'last-words')
    expect(fact.kind === 'lost' && fact.detail).toContain('the valve is stuck')
  })

  test('one that eats the heap is lost by memory, and nobody else', async () => {
    expect(await among(await started({ megabytes: 48 }), 'heap')).toMatchObject({
      kind: 'lost',
      cause: 'memory',
    })
  })

  test('one that eats memory outside the heap is lost by memory, and nobody else', async () => {
    const dispatcher = await started({ megabytes: 48, leastSeconds: 60, unmeasuredSeconds: 60 })
    expect(await among(dispatcher, 'arrays')).toMatchObject({ kind: 'lost', cause: 'memory' })
  })

  test.each(['throw', 'deep', 'nan'])(
    'a simulation that goes wrong (%s) gives failed rows and is not lost',
    async (deed) => {
      const fact = await among(await started(), deed)
      expect(fact.kind).toBe('result')
      if (fact.kind === 'result') expect(fact.result.failures.length).toBe(itemOf(1).replicates * 2)
    },
  )

  test('printing a hundred megabytes changes nothing', async () => {
    expect((await among(await started(), 'print')).kind).toBe('result')
  })

  test('an error thrown after the simulation changes nothing', async () => {
    const dispatcher = await started()
    for (const attempt of [1, 2, 3]) {
      const facts = await run(
        dispatcher,
        numbers(20).map((n) => itemOf(n, 'throw-later', { attempt })),
      )
      expect(facts.filter(isLost)).toEqual([])
    }
  })

  test.each([
    ['one piece of memory beyond all limits', 'memory', 'large'],
    ['a crash that ends the whole process', 'died', 'abort'],
  ])('%s is lost as %s, and nobody else', async (_, cause, deed) => {
    const dispatcher = await started({ megabytes: 48 })
    expect(await among(dispatcher, deed)).toMatchObject({ kind: 'lost', cause })
    const later = numbers(20, 500).map((n) => itemOf(n))
    expectExact(await run(dispatcher, later), later)
  })

  test('every second one deadly: each death is its own, all others are answered well', async () => {
    const dispatcher = await started()
    const items = numbers(24).map((n) => itemOf(n, n % 2 === 0 ? 'exit' : 'well'))
    const facts = await run(dispatcher, items)
    expect(facts.length).toBe(24)
    expect(
      facts.filter(isLost).every(({ item, cause }) => item.evaluation % 2 === 0 && cause === 'died'),
    ).toBe(true)
    expect(facts.filter(isResult).every(({ item }) => item.evaluation % 2 === 1)).toBe(true)
    expectExact(facts, items)
  })
}

function isolating(started: Started): void {
  const alone = { isolation: 'alone' } as const
  const confirm = { purpose: 'confirm' } as const
  const pidOf = (fact: DispatchFact): number => (fact.kind === 'result' ? fact.result.values[0]! : Number.NaN)

  test('alone and confirming simulations give the same bits as shared ones', async () => {
    const items = numbers(6).map((n) => itemOf(n))
    const again = numbers(30, 7).map((n) => itemOf(n, 'well', confirm))
    const apart = numbers(4, 50).map((n) => itemOf(n, 'well', alone))
    const facts = await run(await started(), [...items, ...again, ...apart])
    expect(facts.filter(isLost)).toEqual([])
    expectExact(facts, [...items, ...again, ...apart])
  })

  test('alone is a process of its own for each item, confirming is another process than the first', async () => {
    const dispatcher = await started()
    const apart = await run(
      dispatcher,
      [1, 2].map((n) => itemOf(n, 'pid', alone)),
    )
    const again = await run(
      dispatcher,
      [3, 4].map((n) => itemOf(n, 'pid', confirm)),
    )
    const first = await run(
      dispatcher,
      [5].map((n) => itemOf(n, 'pid')),
    )
    expect(new Set([...apart, ...first].map(pidOf)).size).toBe(3)
    for (const fact of again) {
      expect([...apart, ...first].map(pidOf)).not.toContain(pidOf(fact))
      expect(first.map(({ executor }) => executor.worker)).not.toContain(fact.executor.worker)
    }
    for (const fact of [...apart, ...again]) {
      expect(fact.executor.kind).toBe('process')
      expect(pidOf(fact)).not.toBe(process.pid)
      expect(fact.executor.worker).toContain(String(pidOf(fact)))
    }
  })

  test.each([
    ['exit', 'died'],
    ['loop', 'time-limit'],
    ['heap', 'memory'],
    ['arrays', 'memory'],
  ])('alone, %s is lost as %s, and the next one is well', async (deed, cause) => {
    const seconds = cause === 'memory' ? 60 : 2
    const dispatcher = await started({ megabytes: 48, leastSeconds: seconds, unmeasuredSeconds: seconds })
    const items = [itemOf(1, deed, alone), itemOf(2, 'well', alone), itemOf(3, 'well', confirm)]
    const facts = await run(dispatcher, items)
    expect(facts.find(({ item }) => item.evaluation === 1)).toMatchObject({ kind: 'lost', cause })
    expect(facts.filter(isResult).length).toBe(2)
    expectExact(facts, items)
  })

  test('an item is not simulated by those it must avoid', async () => {
    const dispatcher = await started()
    const seen = new Set<string>()
    for (const purpose of ['evaluate', 'confirm', 'evaluate', 'confirm', 'confirm'] as const) {
      const item = itemOf(1, 'well', { purpose, avoid: [...seen], attempt: seen.size + 1 })
      const [fact] = await run(dispatcher, [item])
      expect(fact?.kind).toBe('result')
      expect([...seen]).not.toContain(fact?.executor.worker)
      if (fact) seen.add(fact.executor.worker)
    }
  })

  test('a death while confirming blames only the one that died', async () => {
    const dispatcher = await started()
    const items = numbers(9).map((n) => itemOf(n, n === 4 ? 'exit' : 'well', confirm))
    const facts = await run(dispatcher, items)
    expect(facts.filter(isLost).map(({ item }) => item.evaluation)).toEqual([4])
    expectExact(facts, items)
  })

  test('printing a hundred megabytes alone changes nothing', async () => {
    const facts = await run(await started(), [itemOf(1, 'print', alone)])
    expect(facts.map(({ kind }) => kind)).toEqual(['result'])
  })
}

function closing(started: Started): void {
  test('closes within five seconds although simulations hang, and leaves no process behind', async () => {
    const dispatcher = await started({ leastSeconds: 600, unmeasuredSeconds: 600 })
    const [known] = await run(dispatcher, [itemOf(1, 'pid', { purpose: 'confirm' })])
    const confirming = known?.kind === 'result' ? known.result.values[0]! : Number.NaN
    expect(isAlive(confirming)).toBe(true)
    dispatcher.submit([
      itemOf(2, 'loop'),
      itemOf(3, 'loop'),
      itemOf(4, 'loop', { purpose: 'confirm' }),
      itemOf(5, 'loop', { isolation: 'alone' }),
    ])
    await dispatcher.facts(500)
    const startMs = performance.now()
    await dispatcher.close()
    expect(performance.now() - startMs).toBeLessThan(5000)
    expect(isAlive(confirming)).toBe(false)
  })

  test('a caller who waits for facts is let go by close()', async () => {
    const dispatcher = await started()
    const waiting = dispatcher.facts(60_000)
    await dispatcher.close()
    expect(await waiting).toEqual([])
  })
}
