// How votes are read, case by case: who is believed, who is wrong, who is asked next.

import { describe, expect, it } from 'vitest'
import { equalBytes, resultDigest } from '../../shared/digests.js'
import { type Reading, type Vote, verdictOf } from './votes.js'

/** 'h1A 7': machine h1 of class A says 7; 'h1A/2 7': another process of it. */
function vote(text: string): Vote {
  const [, host, processor, process = '1', value] = /^(h\d+)([AB])(?:\/(\d))? (\S+)$/.exec(text)!
  const result = { values: Float64Array.of(Number(value)), failures: [] }
  const executor = {
    kind: 'thread',
    worker: `${host}/${process}`,
    host: host!,
    processor: processor!,
  } as const
  return { result, digest: resultDigest(result), executor }
}

function verdict(texts: readonly string[], fleet: readonly string[] = [], out: readonly string[] = []) {
  const reading: Reading = {
    voterOf: ({ host }) => host,
    classOf: ({ processor }) => processor ?? '',
    counts: ({ host }) => !out.includes(host),
    agree: (a, b) => equalBytes(a.digest, b.digest),
    hasOthers: (hosts, processor) =>
      fleet.some(
        (one) => !hosts.has(one.slice(0, -1)) && (processor === undefined || one.endsWith(processor)),
      ),
  }
  return verdictOf(texts.map(vote), reading)
}

const wrongOf = (found: ReturnType<typeof verdict>) =>
  found.kind === 'confirmed' ? found.wrong.map(({ executor }) => executor.host) : undefined

describe('votes of machines', () => {
  it('two that agree confirm, one does not, nor one that says it twice', () => {
    expect(verdict(['h1A 7']).kind).toBe('unconfirmed')
    expect(verdict(['h1A 7', 'h1A/2 7']).kind).toBe('unconfirmed')
    expect(verdict(['h1A 7', 'h2A 7'])).toMatchObject({ kind: 'confirmed', by: 'host', wrong: [] })
    expect(verdict(['h1A 7', 'h2B 7'])).toMatchObject({ kind: 'confirmed', wrong: [] })
  })

  it('a difference is settled on the class in doubt, first that of the vote that came first', () => {
    expect(verdict(['h1A 7', 'h2A 8'])).toEqual({ kind: 'disputed', onProcessors: ['A'] })
    expect(verdict(['h1B 7', 'h2A 8'])).toEqual({ kind: 'disputed', onProcessors: ['B', 'A'] })
    const fleet = ['h4B']
    expect(verdict(['h1A 7', 'h2B 8', 'h3A 7'], fleet)).toEqual({
      kind: 'disputed',
      onProcessors: ['B', 'A'],
    })
  })

  it('two against one of the same class convict, also with the help of another class', () => {
    expect(wrongOf(verdict(['h1A 8', 'h2A 7', 'h3A 7']))).toEqual(['h1'])
    expect(wrongOf(verdict(['h1A 8', 'h2A 7', 'h3B 7']))).toEqual(['h1'])
    expect(wrongOf(verdict(['h1A 7', 'h2B 8', 'h3A 7', 'h4B 7']))).toEqual(['h2'])
  })

  it('answers that follow the class blame the problem, not a machine', () => {
    const fleet = ['h9A', 'h8B']
    expect(verdict(['h1A 7', 'h2B 8', 'h3A 7', 'h4B 8'], fleet)).toMatchObject({
      kind: 'processor-dependent',
      processors: [
        { processor: 'A', voters: 2 },
        { processor: 'B', voters: 2 },
      ],
    })
    // The only machine of its class cannot be asked by another of it.
    expect(verdict(['h1A 7', 'h2B 8', 'h3A 7'], ['h9A'])).toMatchObject({
      kind: 'processor-dependent',
      processors: [{ processor: 'A' }, { processor: 'B' }],
    })
    // Two machines, one of each class, which both repeat themselves.
    expect(verdict(['h1A 7', 'h2B 8', 'h1A/2 7', 'h2B/2 8']).kind).toBe('processor-dependent')
    expect(verdict(['h1A 7', 'h2B 8', 'h1A/2 7']).kind).toBe('disputed')
  })

  it('two of one class that both repeat themselves stay undecided', () => {
    expect(verdict(['h1A 7', 'h2A 8', 'h1A/2 7', 'h2A/2 8']).kind).toBe('disputed')
  })

  it('a machine that contradicts itself is no witness; two of them are the fault of the problem', () => {
    expect(verdict(['h1A 8', 'h1A/2 7', 'h2A 7'], ['h3A']).kind).toBe('disputed')
    expect(wrongOf(verdict(['h1A 8', 'h1A/2 7', 'h2A 7', 'h3A 7']))).toEqual(['h1'])
    expect(wrongOf(verdict(['h1A 8', 'h1A/2 7', 'h2A 7', 'h2A/2 7']))).toEqual(['h1'])
    expect(verdict(['h1A 8', 'h1A/2 7', 'h2A 7', 'h2A/2 9']).kind).toBe('not-deterministic')
    expect(verdict(['h1A 1', 'h2A 2', 'h3A 3', 'h4A 4', 'h5A 5']).kind).toBe('not-deterministic')
  })

  it('whoever is shut out may agree, but neither objects nor is convicted twice', () => {
    expect(wrongOf(verdict(['h1A 8', 'h2A 7'], ['h3A'], ['h1']))).toBeUndefined()
    expect(wrongOf(verdict(['h1A 8', 'h2A 7', 'h3A 7'], [], ['h1']))).toEqual([])
    expect(verdict(['h1A 7', 'h2A 7'], [], ['h1'])).toMatchObject({ kind: 'confirmed', wrong: [] })
  })
})
