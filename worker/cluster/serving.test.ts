import { mkdtempSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest'
import { BrokenPromise } from '../../shared/check.js'
import { signatureOf } from '../../shared/cluster/signature.js'
import { refuse } from '../../shared/refusals.js'
import { scene, WaitingPool } from '../../tests/agent-fixture.js'
import { PluginCache } from './plugins.js'

beforeEach(() => {
  vi.useFakeTimers({ toFake: ['setTimeout', 'clearTimeout', 'setInterval', 'clearInterval', 'performance'] })
  WaitingPool.made.length = 0
})
afterEach(() => vi.useRealTimers())

describe('which searches are served', () => {
  test('another version: both are named, nothing is taken, and with no other search the code is 76', async () => {
    const made = scene()
    made.queue.announce('weir', { protocol: 99, skerry: '9.9.9' })
    made.queue.add('weir', [100])
    await made.pass(5000)
    expect(made.said.join('\n')).toContain(
      'speaks version 99 of the protocol (Skerry 9.9.9), this worker version 1',
    )
    expect(made.end).toBeUndefined()
    await made.pass(10_000)
    expect(made.end).toMatchObject({ exitCode: 76 })
    expect(made.queue.calls).not.toContain('take weir')
  })

  test('beside a search of its own version the other one is no reason to end', async () => {
    const made = scene()
    made.queue.announce('weir', { protocol: 99 })
    made.queue.announce('sluice')
    await made.pass(20_000)
    made.queue.add('sluice', [100])
    await made.pass(3000)
    expect(made.end).toBeUndefined()
    expect(made.queue.answers).toHaveLength(1)
    expect(made.said.filter((line) => line.includes('version 99'))).toHaveLength(1)
  })

  test('with a key: an unsigned problem is refused and never run, with 77 in the end; a signed one is served', async () => {
    const folder = mkdtempSync(join(tmpdir(), 'skerry-serving-'))
    const key = new TextEncoder().encode('the key of the water works')
    const made = scene({ cache: new PluginCache({ folder, key: () => key }) })
    const { pluginDigest } = made.queue.announce('weir')
    made.queue.add('weir', [100])
    await made.pass(8000)
    expect(made.said.join('\n')).toContain('carries no signature')
    expect(made.queue.beats.at(-1)!.lastWord).toContain('carries no signature')
    expect(made.queue.calls).not.toContain('plugin')
    made.queue.announce('weir', { signature: signatureOf(key, pluginDigest) })
    await made.pass(5000)
    expect(made.queue.answers).toHaveLength(1)
    made.queue.announce('weir', { signature: 'f'.repeat(64) })
    await made.pass(15_000)
    expect(made.end).toMatchObject({ exitCode: 77 })
    rmSync(folder, { recursive: true })
  })

  test('a problem that cannot be loaded here: its jobs go back, and it is not tried again and again', async () => {
    const fault = refuse('no-workers', { detail: 'the pinned problem cannot be loaded: no such pump' })
    const made = scene({ createPool: (options, events) => new WaitingPool(options, events, fault) })
    made.queue.announce('weir')
    const dispatch = made.queue.add('weir', [100])
    await made.pass(8000)
    expect(made.queue.handedBack).toEqual([dispatch])
    expect(WaitingPool.made).toHaveLength(1)
    expect(made.said.join('\n')).toContain('no such pump')
    await made.pass(10_000)
    expect(made.end).toMatchObject({ exitCode: 69 })
  })

  test('a machine too small for its simulations serves it not, and stays', async () => {
    const made = scene()
    made.queue.announce('weir', { needs: { cores: 3, memoryMB: 10, tokens: {} } })
    made.queue.add('weir', [100])
    await made.pass(70_000)
    expect(made.end).toBeUndefined()
    expect(made.said.join('\n')).toContain('needs 3 cores and 10 MB; this worker has 2 cores')
  })

  test('shut out: what it holds goes back, nothing more is taken', async () => {
    const made = scene()
    made.queue.announce('weir')
    const dispatch = made.queue.add('weir', [60_000])
    await made.pass(3000)
    made.queue.announce('weir', { shutOut: ['host-a'] })
    await made.pass(2000)
    made.queue.add('weir', [100])
    await made.pass(5000)
    expect(made.queue.handedBack).toEqual([dispatch])
    expect(made.queue.answers).toEqual([])
  })

  test('a search that is gone from the list is over: its simulations end, others get the cores', async () => {
    const made = scene()
    made.queue.announce('weir')
    made.queue.add('weir', [600_000, 600_000])
    await made.pass(3000)
    made.queue.announcements.delete('weir')
    made.queue.announce('sluice')
    made.queue.add('sluice', [100])
    await made.pass(12_000)
    expect(made.said).toContain('Search weir is over.')
    expect(WaitingPool.made[0]!.closed).toBe(true)
    expect(made.queue.answers).toHaveLength(1)
  })

  test('a silent coordinator: what runs is finished and answered, nothing more is taken until it is back', async () => {
    const made = scene()
    made.queue.announce('weir')
    made.queue.add('weir', [20_000])
    await made.pass(3000)
    made.isSilent.coordinator = true
    await made.pass(14_000)
    made.queue.add('weir', [100])
    await made.pass(8000)
    expect(made.queue.answers).toHaveLength(1)
    made.isSilent.coordinator = false
    await made.pass(5000)
    expect(made.queue.answers).toHaveLength(2)
  })

  test('another record under the same name is served with a pool of its own', async () => {
    const made = scene()
    made.queue.announce('weir')
    made.queue.add('weir', [100])
    await made.pass(3000)
    made.queue.announce('weir', { record: 'record-2', seed: 2 })
    made.queue.add('weir', [100])
    await made.pass(5000)
    expect(WaitingPool.made.map(({ options, closed }) => [options.seed, closed])).toEqual([
      [1, true],
      [2, false],
    ])
    expect(made.queue.answers).toHaveLength(2)
  })

  test('a broken promise of our own ends the agent with 70, its work handed back', async () => {
    const made = scene()
    made.queue.announce('weir')
    made.queue.add('weir', [60_000])
    await made.pass(2000)
    WaitingPool.made[0]!.fail(new BrokenPromise('broken promise: x'))
    await made.pass(2000)
    expect(made.end).toMatchObject({ exitCode: 70 })
    expect(made.queue.handedBack).toHaveLength(1)
  })
})

describe('needs', () => {
  test('cores: three of two cores each run one after the other on a machine of three', async () => {
    const made = scene({ cores: 3 })
    made.queue.announce('weir', { needs: { cores: 2, memoryMB: 10, tokens: {} } })
    for (let i = 0; i < 3; i++) made.queue.add('weir', [2000])
    let most = 0
    for (let i = 0; i < 16; i++) {
      await made.pass(500)
      most = Math.max(most, WaitingPool.made[0]?.running ?? 0)
    }
    expect(most).toBe(1)
    expect(made.queue.answers).toHaveLength(3)
  })

  test('memory: as many as fit, together with those of another search', async () => {
    const made = scene({ cores: 8, memoryMB: 1000 })
    made.queue.announce('large', { needs: { cores: 1, memoryMB: 400, tokens: {} } })
    made.queue.announce('small', { needs: { cores: 1, memoryMB: 100, tokens: {} } })
    for (let i = 0; i < 20; i++) made.queue.add('large', [1000])
    for (let i = 0; i < 20; i++) made.queue.add('small', [1000])
    let most = 0
    for (let i = 0; i < 20; i++) {
      await made.pass(500)
      const held = WaitingPool.made.reduce(
        (sum, pool) => sum + pool.running * (pool.options.megabytes ?? 0),
        0,
      )
      most = Math.max(most, held)
    }
    expect(most).toBeGreaterThan(500)
    expect(most).toBeLessThanOrEqual(1000)
  })

  test('a simulation of all cores gets its turn among small ones', async () => {
    const made = scene({ cores: 4 })
    made.queue.announce('wide', { needs: { cores: 4, memoryMB: 10, tokens: {} } })
    made.queue.announce('narrow')
    for (let i = 0; i < 400; i++) made.queue.add('narrow', [500])
    made.queue.add('wide', [1000])
    await made.pass(15_000)
    expect(made.queue.answers.filter(({ wallSeconds }) => wallSeconds === 1)).toHaveLength(1)
  })

  test('tokens: never more at once than the site has, and given back in the end', async () => {
    const made = scene({ cores: 4 })
    made.queue.announce('weir', {
      needs: { cores: 1, memoryMB: 10, tokens: { flow: 2 } },
      tokens: { flow: 5 },
    })
    for (let i = 0; i < 6; i++) made.queue.add('weir', [2000])
    let most = 0
    for (let i = 0; i < 30; i++) {
      await made.pass(500)
      most = Math.max(most, WaitingPool.made[0]?.running ?? 0)
    }
    expect(most).toBe(2)
    expect(made.queue.answers).toHaveLength(6)
    expect(made.queue.tokens.size).toBe(0)
  })

  test('tokens are counted across agents: two machines together never hold more than the site has', async () => {
    const one = scene({ cores: 4 })
    const two = scene({ cores: 4, agent: 'host-b-2-0000', host: 'host-b' }, one.queue)
    one.queue.announce('weir', {
      needs: { cores: 1, memoryMB: 10, tokens: { flow: 1 } },
      tokens: { flow: 3 },
    })
    for (let i = 0; i < 12; i++) one.queue.add('weir', [2000])
    let most = 0
    const hosts = new Set<string>()
    for (let i = 0; i < 40; i++) {
      await one.pass(500)
      most = Math.max(
        most,
        WaitingPool.made.reduce((sum, { running }) => sum + running, 0),
      )
      for (const { running, options } of WaitingPool.made) if (running > 0) hosts.add(options.host ?? '')
    }
    expect(most).toBe(3)
    expect(hosts.size).toBe(2)
    expect(one.queue.answers).toHaveLength(12)
    expect(one.queue.tokens.size).toBe(0)
    two.stop()
  })

  test('tokens that the site bought meanwhile are used without starting anything again', async () => {
    const made = scene({ cores: 4 })
    const needs = { cores: 1, memoryMB: 10, tokens: { flow: 1 } }
    made.queue.announce('weir', { needs, tokens: { flow: 1 } })
    for (let i = 0; i < 12; i++) made.queue.add('weir', [2000])
    const mostIn = async (halfSeconds: number) => {
      let most = 0
      for (let i = 0; i < halfSeconds; i++) {
        await made.pass(500)
        most = Math.max(most, WaitingPool.made[0]?.running ?? 0)
      }
      return most
    }
    expect(await mostIn(12)).toBe(1)
    made.queue.announce('weir', { needs, tokens: { flow: 3 } })
    expect(await mostIn(12)).toBe(3)
    expect(WaitingPool.made).toHaveLength(1)
  })

  test('tokens in use elsewhere: it waits without taking jobs, and without asking all the time', async () => {
    const made = scene()
    made.queue.announce('weir', {
      needs: { cores: 1, memoryMB: 10, tokens: { flow: 1 } },
      tokens: { flow: 1 },
    })
    made.queue.tokens.set('elsewhere', { tokens: { flow: 1 } })
    made.queue.add('weir', [1000])
    await made.pass(20_000)
    expect(made.queue.active.size).toBe(0)
    expect(made.queue.calls.filter((call) => call === 'takeTokens').length).toBeLessThanOrEqual(22)
    expect(made.end).toBeUndefined()
    made.queue.tokens.delete('elsewhere')
    await made.pass(4000)
    expect(made.queue.answers).toHaveLength(1)
  })

  test('tokens are renewed while a simulation holds them', async () => {
    const made = scene()
    made.queue.announce('weir', {
      needs: { cores: 1, memoryMB: 10, tokens: { flow: 1 } },
      tokens: { flow: 1 },
    })
    made.queue.add('weir', [30_000])
    await made.pass(20_000)
    expect(made.queue.calls.filter((call) => call === 'renewTokens').length).toBeGreaterThanOrEqual(3)
  })
})
