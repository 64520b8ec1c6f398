import { afterEach, beforeEach, expect, test, vi } from 'vitest'
import { resultDigest } from '../../shared/digests.js'
import { itemOf, MemoryQueue } from '../../tests/agent-fixture.js'
import { HeldJob } from './held.js'
import { type Letter, Outbox } from './outbox.js'

beforeEach(() => {
  vi.useFakeTimers()
})
afterEach(() => vi.useRealTimers())

function job(count: number): HeldJob {
  const queue = new MemoryQueue()
  queue.add('weir', Array(count).fill(1))
  return new HeldJob({ job: queue.waiting.get('weir')![0]!, id: 'd1', token: 't', queue: 'work' }, 1)
}

function letter(of: HeldJob, index: number, values = 1): Letter {
  const result = { values: new Float64Array(values), failures: [] }
  const executor = { kind: 'thread', worker: 'w', host: 'h' } as const
  const item = itemOf(index, 1, {})
  const answer = {
    dispatch: 1,
    index,
    item,
    result,
    digest: resultDigest(result),
    executor,
    cpuSeconds: 0,
    wallSeconds: 0,
  }
  return { job: of, answer }
}

/** An outbox whose server takes 50 ms, unless it is down. */
function posted(bytesMost = 1e6) {
  const sent: number[] = []
  const written: number[] = []
  const state = { down: false }
  const box = new Outbox({
    lingerMs: 100,
    retryMs: 1000,
    bytesMost,
    send: async (letters) => {
      sent.push(letters.length)
      await new Promise((resolve) => setTimeout(resolve, 50))
      return !state.down
    },
    written: (letters) => written.push(letters.length),
  })
  return { box, sent, written, state }
}

test('letters wait for company, but not longer than said', async () => {
  const { box, sent } = posted()
  const of = job(3)
  box.put(letter(of, 0), false)
  await vi.advanceTimersByTimeAsync(60)
  box.put(letter(of, 1), false)
  expect(sent).toEqual([])
  await vi.advanceTimersByTimeAsync(50)
  expect(sent).toEqual([2])
})

test('the last letter of a job takes all along at once; what comes while one is under way goes next, together', async () => {
  const { box, sent, written } = posted()
  const of = job(9)
  box.put(letter(of, 0), false)
  box.put(letter(of, 1), true)
  expect(sent).toEqual([2])
  for (let i = 2; i < 6; i++) box.put(letter(of, i), true)
  await vi.advanceTimersByTimeAsync(200)
  expect(sent).toEqual([2, 4])
  expect(written).toEqual([2, 4])
  expect(box.length).toBe(0)
})

test('what could not be written stays, is tried again after a while, and at once when the server is back', async () => {
  const { box, sent, written, state } = posted()
  state.down = true
  box.put(letter(job(1), 0), true)
  await vi.advanceTimersByTimeAsync(5000)
  expect(sent.length).toBeGreaterThanOrEqual(4)
  expect(sent.length).toBeLessThanOrEqual(6)
  expect(written).toEqual([])
  state.down = false
  box.retry()
  await vi.advanceTimersByTimeAsync(60)
  expect(written).toEqual([1])
})

test('memory is bounded: an answer beyond it is given up, a loss still goes', () => {
  const { box } = posted(1000)
  const of = job(3)
  expect(box.put(letter(of, 0, 70), false)).toBe(true)
  expect(box.isCrowded).toBe(true)
  expect(box.put(letter(of, 1, 70), false)).toBe(false)
  const executor = { kind: 'thread', worker: 'w', host: 'h' } as const
  const loss = { dispatch: 1, index: 1, cause: 'handed-back', detail: '', executor } as const
  expect(box.put({ job: of, loss }, false)).toBe(true)
  expect(box.length).toBe(2)
})

test('flush writes everything, also more than one message holds, and ends when the server is away', async () => {
  const { box, sent, state } = posted(1e9)
  const of = job(9)
  for (let i = 0; i < 9; i++) box.put(letter(of, i, 100_000), false)
  const flushed = box.flush()
  await vi.advanceTimersByTimeAsync(1000)
  await flushed
  expect(sent.length).toBeGreaterThan(1)
  expect(box.length).toBe(0)
  state.down = true
  box.put(letter(of, 0), false)
  const again = box.flush()
  await vi.advanceTimersByTimeAsync(1000)
  await again
  expect(box.length).toBe(1)
})
