import { describe, expect, it } from 'vitest'
import { counted, duration, estimate, grouped, percent, short } from './numbers.js'
import type { IslandView, ProgressView } from './progress-view.js'
import { drawProgress, LiveBlock, level, logLine, wrap } from './terminal.js'

const best = {
  id: 'i3-01842',
  replicates: 16,
  estimates: [
    { objective: 'distance', unit: 'm', value: 0.8123, standardError: 0.0312 },
    { objective: 'material', unit: 'kg', value: 0.431 },
  ],
  confirmed: true,
}
function island(number: number, rest: Partial<IslandView> = {}): IslandView {
  return {
    name: `i${number}`,
    method: 'age-fitness-pareto',
    committed: 400,
    proposed: 424,
    simulations: 1600,
    quota: 5000,
    epoch: 4,
    state: 'searching',
    best,
    ...rest,
  }
}
export const view: ProgressView = {
  state: 'searching',
  name: 'culvert-crawler',
  record: 'records/culvert-crawler',
  recordVersion: 1,
  semantics: 1,
  committed: 3120,
  proposed: 3168,
  simulations: 12480,
  budget: 200000,
  failedSimulations: 3,
  setAside: 0,
  best,
  islands: [
    island(1),
    island(2, { state: 'waiting', because: 'for emigrants of i1' }),
    island(3, { state: 'ended' }),
  ],
  controls: [{ ...island(1), name: 'c1', method: 'drift' }],
  digest: '3fa91c0a77b2d4e83fa91c0a77b2d4e83fa91c0a77b2d4e83fa91c0a77b2d4e8',
  purity: 'none',
  rate: { simulationsPerSecond: 412, busyFraction: 0.973, cores: 2, secondsLeft: 11520 },
}

describe('the live view', () => {
  it('stays inside every width from 60 to 200 columns, whatever is in it', () => {
    const wide = {
      ...view,
      name: 'x'.repeat(60),
      because: 'the disk is full and nobody has made room on it yet',
      state: 'paused' as const,
    }
    for (const one of [view, wide]) {
      for (let columns = 60; columns <= 200; columns++) {
        for (const line of drawProgress(one, { columns, unicode: true, islandsMost: 24 })) {
          expect(line.length, `${columns}: ${line}`).toBeLessThanOrEqual(columns)
        }
      }
    }
  })
  it('says state, share, time left, best with unit, error and sample size, rate, purity and digest in words', () => {
    const text = drawProgress(view, {
      columns: 100,
      unicode: true,
      islandsMost: 24,
      clockAfter: () => '18:40',
    })
      .join(' ')
      .replace(/\s+/g, ' ')
    expect(text).toContain(
      'culvert-crawler is searching: 12,480 of 200,000 simulations (6.2 %), about 3 h 12 min to go, ending about 18:40.',
    )
    expect(text).toContain('i3-01842: distance 0.812 ± 0.031 m, material 0.431 kg (mean of 16 replicates')
    expect(text).toContain('412 simulations/s on 2 cores, busy 97 %')
    expect(text).toContain('waits for emigrants of i1')
    expect(text).toContain('drift, control')
    expect(text).toContain('3fa91c0a77b2d4e8')
  })
  it('needs no character beyond ASCII where the terminal has none', () => {
    const lines = drawProgress(view, { columns: 90, unicode: false, islandsMost: 24 }).join('\n')
    expect(lines).toMatch(/^[\x20-\x7e\n]*$/)
  })
  it('sums up islands beyond the most', () => {
    const many = { ...view, islands: Array.from({ length: 60 }, (_, index) => island(index + 1)) }
    const lines = drawProgress(many, { columns: 80, unicode: true, islandsMost: 24 })
    expect(lines.some((line) => line.includes('and 37 more islands'))).toBe(true)
  })
  it('has a line for a log', () => {
    expect(logLine(view, '2026-12-01T10:00:00')).toBe(
      '2026-12-01T10:00:00  searching: 12,480 of 200,000 simulations, 3 failed, 412/s, 3 h 12 min to go, best i3-01842 distance 0.812 ± 0.031 m (16 replicates)',
    )
  })
  it('says in a log why it is paused', () => {
    const paused = { ...view, state: 'paused' as const, because: 'the disk is full' }
    expect(logLine(paused, 'now')).toContain('now  paused (the disk is full): 12,480 of')
    expect(logLine(paused, 'now')).not.toContain('to go')
  })
  it('fills the channel of a quota only when all of it is used', () => {
    expect(level(0.999, 10, false)).toBe('ooooooooo.')
    expect(level(1, 10, false)).toBe('oooooooooo')
    expect(level(2, 4, false)).toBe('oooo')
  })
  it('redraws in place with one write, and leaves nothing of a taller block', () => {
    const written: string[] = []
    const block = new LiveBlock({ columns: 80, raw: (text: string) => written.push(text) } as never)
    block.draw(['a', 'b', 'c'])
    block.draw(['d'])
    expect(written).toEqual(['a\u001b[K\nb\u001b[K\nc\u001b[K\n\u001b[J', '\u001b[3A\rd\u001b[K\n\u001b[J'])
  })
})

describe('numbers', () => {
  it('are written in one way', () => {
    expect([grouped(1234567), short(0.000123), short(0.0456), short(-4321), short(12.34)]).toEqual([
      '1,234,567',
      '1.23e-4',
      '0.0456',
      '-4,321',
      '12.3',
    ])
    expect([percent(0.9999), percent(1), percent(0.0012)]).toEqual(['99 %', '100 %', '0.1 %'])
    expect([duration(0.5), duration(59), duration(61), duration(3661), duration(90000)]).toEqual([
      '0.500 s',
      '59 s',
      '1 min 1 s',
      '1 h 1 min',
      '1 d 1 h',
    ])
    expect([counted(1, 'island'), counted(2, 'island')]).toEqual(['1 island', '2 islands'])
    expect([estimate(0.8123, 'm', 0.0312), estimate(12.345, '1'), estimate(1234.5, 'N', 98)]).toEqual([
      '0.812 ± 0.031 m',
      '12.3',
      '1235 ± 98 N',
    ])
  })
  it('wrap at spaces and leave long words whole', () => {
    expect(wrap('one two three', 7)).toEqual(['one two', 'three'])
    expect(wrap('incomprehensibilities', 5)).toEqual(['incomprehensibilities'])
  })
})
