import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest'
import { MemoryQueue, scene, WaitingPool } from '../../tests/agent-fixture.js'

beforeEach(() => {
  vi.useFakeTimers({ toFake: ['setTimeout', 'clearTimeout', 'setInterval', 'clearInterval', 'performance'] })
  WaitingPool.made.length = 0
})
afterEach(() => vi.useRealTimers())

describe('told to leave', () => {
  test('finished items are answered, the rest of their job is a loss nobody is blamed for, untouched jobs go back', async () => {
    const made = scene()
    const { queue, pass, stop } = made
    queue.announce('weir')
    const begun = queue.add('weir', [1000, 60_000, 60_000])
    const untouched = queue.add('weir', [60_000])
    await pass(1500)
    // The answer of the first item is here and not yet written.
    stop()
    await pass(2000)
    expect(queue.answers.map(({ dispatch, index }) => [dispatch, index])).toEqual([[begun, 0]])
    expect(queue.losses.map(({ dispatch, index, cause }) => [dispatch, index, cause])).toEqual([
      [begun, 1, 'handed-back'],
      [begun, 2, 'handed-back'],
    ])
    expect(queue.finished).toEqual([begun])
    expect(queue.waiting.get('weir')?.map(({ header }) => header.dispatch) ?? []).toEqual([untouched])
    expect(queue.active.size).toBe(0)
    expect(queue.left).toEqual(['host-a-1-abcd'])
    expect(made.end).toMatchObject({ exitCode: 75 })
    expect(made.end).toHaveProperty('sentence', 'Told to end. 2 evaluations went back unfinished.')
  })

  test('a job of which nothing is answered goes back whole, at once', async () => {
    const { queue, pass, stop } = scene()
    queue.announce('weir')
    const dispatch = queue.add('weir', [60_000])
    await pass(2000)
    stop()
    await pass(500)
    expect(queue.handedBack).toEqual([dispatch])
    expect(queue.losses).toEqual([])
  })

  test('with nothing in hand: exit code 0, gone from the list of agents', async () => {
    const made = scene()
    made.queue.announce('weir')
    await made.pass(2000)
    made.stop()
    await made.pass(1000)
    expect(made.end).toMatchObject({ exitCode: 0 })
    expect(made.queue.left).toHaveLength(1)
  })

  test('short simulations may end first: nothing goes back', async () => {
    const made = scene()
    made.queue.announce('weir', { secondsPerCost: 0.001 })
    made.queue.add('weir', [20, 20])
    await made.pass(3000)
    made.queue.add('weir', [90, 90])
    await vi.advanceTimersByTimeAsync(30)
    made.stop()
    await made.pass(2000)
    expect(made.queue.answers).toHaveLength(4)
    expect(made.end).toMatchObject({ exitCode: 0 })
  })

  test.each(['frozen', 'down'] as const)(
    'Redis %s: it ends in time all the same, as one that handed back',
    async (mood) => {
      const made = scene()
      made.queue.announce('weir')
      made.queue.add('weir', [60_000])
      await made.pass(2000)
      made.queue.mood = mood
      made.stop()
      await made.pass(4500)
      expect(made.end).toMatchObject({ exitCode: 75 })
      expect(WaitingPool.made.every(({ closed }) => closed)).toBe(true)
    },
  )

  test('before Redis ever answered', async () => {
    const queue = new MemoryQueue()
    queue.mood = 'down'
    const made = scene({}, queue)
    await made.pass(1000)
    made.stop()
    await made.pass(5000)
    expect(made.end).toMatchObject({ exitCode: 0 })
  })

  test('a job that arrives while it leaves is not kept', async () => {
    const made = scene()
    made.queue.announce('weir')
    await made.pass(2000)
    made.stop()
    made.queue.add('weir', [1000])
    await made.pass(3000)
    expect(made.queue.active.size).toBe(0)
    expect(made.queue.waiting.get('weir')).toHaveLength(1)
    expect(made.queue.answers).toEqual([])
  })

  test('a process that died with the signal to our whole group is no loss of its item', async () => {
    const made = scene()
    made.queue.announce('weir')
    made.queue.add('weir', [60_000])
    await made.pass(2000)
    const [pool] = WaitingPool.made
    pool!.lose(pool!.seen[0]!, 'died')
    await vi.advanceTimersByTimeAsync(50)
    made.stop()
    await made.pass(2000)
    expect(made.queue.losses).toEqual([])
    expect(made.queue.handedBack).toHaveLength(1)
  })
})

describe('the time of the machine', () => {
  const inSeconds = (seconds: number) => ({ untilMs: performance.now() + seconds * 1000 })

  test('nothing is taken that would not end; what runs ends; then it leaves with 0', async () => {
    const made = scene({ ...inSeconds(60) })
    made.queue.announce('weir')
    for (let i = 0; i < 40; i++) made.queue.add('weir', [8000])
    await made.pass(57_000)
    expect(made.end).toMatchObject({ exitCode: 0 })
    expect(made.queue.losses).toEqual([])
    expect(made.queue.handedBack).toEqual([])
    // Two at a time, eight seconds each, from the first second on; the last begins before second 50.
    expect(made.queue.answers.length).toBeGreaterThanOrEqual(10)
    expect(made.states).toContain('draining')
  })

  test('what is still running then goes back, and the code says so', async () => {
    const made = scene({ ...inSeconds(30) })
    made.queue.announce('weir')
    made.queue.add('weir', [60_000])
    await made.pass(31_000)
    expect(made.end).toMatchObject({ exitCode: 75 })
    expect(made.queue.handedBack).toHaveLength(1)
  })

  test('heartbeats say how long it stays', async () => {
    const { queue, pass } = scene({ ...inSeconds(60) })
    await pass(10_000)
    expect(queue.beats.at(-1)!.leavesInSeconds).toBeGreaterThan(48)
    expect(queue.beats.at(-1)!.leavesInSeconds).toBeLessThan(53)
  })
})

describe('not needed', () => {
  test('after so long without work it leaves with 0; work starts the time again', async () => {
    const made = scene({ idleExitMs: 20_000 })
    made.queue.announce('weir')
    await made.pass(15_000)
    made.queue.add('weir', [1000])
    await made.pass(15_000)
    expect(made.end).toBeUndefined()
    await made.pass(10_000)
    expect(made.end).toMatchObject({ exitCode: 0 })
  })

  test('cut off all the while: it leaves as one that could not reach Redis', async () => {
    const made = scene({ idleExitMs: 20_000 })
    await made.pass(5000)
    made.queue.mood = 'down'
    await made.pass(25_000)
    expect(made.end).toMatchObject({ exitCode: 69 })
  })
})

describe('healthy but idle', () => {
  test('work waits, cores are free, the library finds nothing: it ends with 69 and says so', async () => {
    const made = scene()
    made.queue.announce('weir')
    made.queue.add('weir', [1000])
    made.queue.mood = 'deaf'
    await made.pass(50_000)
    expect(made.end).toBeUndefined()
    await made.pass(15_000)
    expect(made.end).toMatchObject({ exitCode: 69 })
    expect(made.end).toHaveProperty('sentence', expect.stringContaining('Work has been waiting for 60 s'))
  })

  test('not while all cores are busy', async () => {
    const made = scene()
    made.queue.announce('weir')
    made.queue.add('weir', [200_000, 200_000])
    await made.pass(3000)
    made.queue.mood = 'deaf'
    made.queue.add('weir', [100])
    await made.pass(70_000)
    expect(made.end).toBeUndefined()
    expect(made.queue.announcements.get('weir')!.waiting).toBe(true)
  })

  test('not while nothing waits', async () => {
    const made = scene()
    made.queue.announce('weir')
    await made.pass(70_000)
    expect(made.end).toBeUndefined()
  })

  test('not while it is drained', async () => {
    const made = scene()
    made.queue.announce('weir', { draining: ['host-a'] })
    made.queue.add('weir', [100])
    await made.pass(70_000)
    expect(made.end).toBeUndefined()
    expect(made.agent.condition.state).toBe('draining')
    expect(made.queue.calls).not.toContain('take weir')
  })

  test('a drained agent takes work again when that is lifted', async () => {
    const { queue, pass } = scene()
    queue.announce('weir', { draining: ['host-a-1-abcd'] })
    queue.add('weir', [100])
    await pass(5000)
    expect(queue.answers).toEqual([])
    queue.announce('weir', { draining: [] })
    await pass(5000)
    expect(queue.answers).toHaveLength(1)
  })
})
