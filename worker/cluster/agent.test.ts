import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest'
import { MemoryQueue, scene, WaitingPool } from '../../tests/agent-fixture.js'

beforeEach(() => {
  vi.useFakeTimers({ toFake: ['setTimeout', 'clearTimeout', 'setInterval', 'clearInterval', 'performance'] })
  WaitingPool.made.length = 0
})
afterEach(() => vi.useRealTimers())

describe('work', () => {
  test('a job is taken, simulated, answered under its dispatch, and finished', async () => {
    const { queue, pass } = scene()
    queue.announce('weir')
    const dispatch = queue.add('weir', [200, 300])
    await pass(3000)
    expect(queue.answers.map(({ dispatch: of, index }) => [of, index])).toEqual([
      [dispatch, 0],
      [dispatch, 1],
    ])
    expect(queue.answers[0]!.executor.processor).toBe('x64 test 1/1')
    expect(queue.finished).toEqual([dispatch])
    expect(queue.active.size).toBe(0)
  })

  test('answers of a long job go out in batches before it is complete', async () => {
    const { queue, pass } = scene()
    queue.announce('weir')
    queue.add('weir', [1000, 1000, 60_000])
    await pass(4000)
    expect(queue.answers).toHaveLength(2)
    expect(queue.finished).toEqual([])
  })

  test('a lost item is a loss in its place, the others are answers', async () => {
    const { queue, pass } = scene()
    queue.announce('weir')
    queue.add('weir', [20_000, 1000])
    await pass(3000)
    const [pool] = WaitingPool.made
    pool!.lose(pool!.seen[0]!, 'died')
    await pass(1000)
    expect(queue.losses).toMatchObject([{ index: 0, cause: 'died' }])
    expect(queue.answers.map(({ index }) => index)).toEqual([1])
    expect(queue.finished).toHaveLength(1)
  })

  test('never more simulations at once than cores, whatever the number of searches', async () => {
    const { queue, pass } = scene()
    for (const search of ['a', 'b', 'c']) {
      queue.announce(search)
      for (let i = 0; i < 10; i++) queue.add(search, [1000])
    }
    let most = 0
    for (let i = 0; i < 20; i++) {
      await pass(500)
      most = Math.max(
        most,
        WaitingPool.made.reduce((sum, pool) => sum + pool.running, 0),
      )
    }
    expect(most).toBe(2)
  })

  test('the same evaluation sent twice is simulated once and answered for both', async () => {
    const { queue, pass } = scene()
    queue.announce('weir')
    const dispatch = queue.add('weir', [5000])
    await pass(2000)
    const [first] = WaitingPool.made[0]!.seen
    queue.add('weir', [5000])
    queue.waiting.get('weir')![0] = { ...queue.waiting.get('weir')![0]!, items: [first!] }
    await pass(6000)
    expect(queue.answers.map((answer) => answer.dispatch).sort()).toEqual([dispatch, dispatch + 1])
    expect(WaitingPool.made[0]!.seen).toHaveLength(1)
  })

  test('work that must avoid this host goes back as handed back, unsimulated', async () => {
    const { queue, pass } = scene()
    queue.announce('weir')
    queue.add('weir', [100, 100], { avoidHosts: ['host-a'] })
    await pass(3000)
    expect(queue.losses.map(({ cause }) => cause)).toEqual(['handed-back', 'handed-back'])
    expect(WaitingPool.made.flatMap(({ seen }) => seen)).toEqual([])
    expect(queue.finished).toHaveLength(1)
  })

  test('a job of another record or an earlier filling of Redis is dropped unread', async () => {
    const { queue, pass } = scene()
    queue.announce('weir')
    queue.add('weir', [100], { record: 'another' })
    queue.add('weir', [100], { instance: 'earlier' })
    await pass(3000)
    expect(queue.finished).toHaveLength(2)
    expect(queue.answers).toEqual([])
  })

  test('heartbeats name what is held, and grow', async () => {
    const { queue, pass } = scene()
    queue.announce('weir')
    const dispatch = queue.add('weir', [60_000])
    await pass(5000)
    const last = queue.beats.at(-1)!
    expect(last.held).toEqual({ weir: [dispatch] })
    expect(last.state).toBe('working')
    expect(queue.beats.map(({ beat }) => beat)).toEqual(queue.beats.map((_, i) => i + 1))
  })
})

describe('fair shares', () => {
  test('two searches with costs 10:1 get equal time within 5 %', async () => {
    const { queue, pass } = scene()
    for (const [search, cost] of [
      ['dear', 2000],
      ['cheap', 200],
    ] as const) {
      queue.announce(search)
      for (let i = 0; i < (200_000 / cost) * 2; i++) queue.add(search, [cost])
    }
    await pass(3000)
    const before = queue.answers.length
    await pass(120_000)
    const seconds = (search: string) =>
      queue.answers.slice(before).filter(({ wallSeconds }) => wallSeconds === (search === 'dear' ? 2 : 0.2))
        .length * (search === 'dear' ? 2 : 0.2)
    const [dear, cheap] = [seconds('dear'), seconds('cheap')]
    expect(dear + cheap).toBeGreaterThan(0.95 * 2 * 120)
    expect(dear / cheap).toBeGreaterThan(0.95)
    expect(dear / cheap).toBeLessThan(1.05)
  })

  test('a share of 3 gets three times the time of a share of 1, also when simulations are short', async () => {
    const { queue, pass } = scene()
    queue.announce('large', { share: 3, secondsPerCost: 0.001 })
    queue.announce('small', { share: 1, secondsPerCost: 0.001 })
    for (let i = 0; i < 600; i++) {
      queue.add('large', Array(20).fill(50))
      queue.add('small', Array(20).fill(20))
    }
    await pass(5000)
    const before = queue.answers.length
    await pass(60_000)
    const time = (wallSeconds: number) =>
      queue.answers.slice(before).filter((answer) => answer.wallSeconds === wallSeconds).length * wallSeconds
    expect(time(0.05) / time(0.02)).toBeGreaterThan(2.8)
    expect(time(0.05) / time(0.02)).toBeLessThan(3.2)
  })
})

describe('Redis', () => {
  test('an outage: what is in hand is simulated, its answers are kept and written when Redis answers again', async () => {
    const { queue, agent, pass, said } = scene()
    queue.announce('weir')
    queue.add('weir', [4000])
    await pass(2000)
    queue.mood = 'down'
    await pass(20_000)
    expect(agent.condition.state).toBe('cut-off')
    expect(queue.answers).toEqual([])
    queue.mood = 'well'
    await pass(3000)
    expect(agent.condition.state).toBe('idle')
    expect(queue.answers).toHaveLength(1)
    expect(queue.finished).toHaveLength(1)
    expect(said.filter((line) => line.includes('cannot be reached'))).toHaveLength(1)
  })

  test('frozen: no call lasts for ever; work goes on after the thaw', async () => {
    const { queue, agent, pass } = scene()
    queue.announce('weir')
    await pass(1000)
    queue.mood = 'frozen'
    await pass(30_000)
    expect(agent.condition.state).toBe('cut-off')
    queue.mood = 'well'
    queue.add('weir', [100])
    await pass(12_000)
    expect(queue.answers).toHaveLength(1)
  })

  test('not there at the start: tried for a while, then refused as unreachable', async () => {
    const queue = new MemoryQueue()
    queue.mood = 'down'
    const made = scene({}, queue)
    await made.pass(10_000)
    expect(made.end).toBeUndefined()
    await made.pass(10_000)
    expect(made.end).toMatchObject({ fault: { code: 'queue-unreachable', exitCode: 69 } })
    expect(queue.calls.length).toBeLessThan(60)
  })

  test('a coordinator that moved to another server is followed, and what was begun is answered there', async () => {
    const [before, after] = [new MemoryQueue(), new MemoryQueue()]
    let url = 'redis://before'
    const { pass } = scene(
      {
        location: { current: async () => url },
        createQueue: (address) => (address === 'redis://before' ? before : after),
      },
      before,
    )
    before.announce('weir')
    before.add('weir', [6000])
    await pass(2000)
    after.announce('weir')
    url = 'redis://after'
    for (let i = 0; i < 20; i++) {
      after.announce('weir')
      await pass(500)
    }
    expect(before.closed).toBe(true)
    expect(after.answers).toHaveLength(1)
  })
})
