import { describe, expect, test } from 'vitest'
import { exitCodes, Refusal, refusals, refuse, renderRefusal } from './refusals.js'

describe('refusals', () => {
  test('every row ends with an exit code of the table, never 0', () => {
    const known = new Set<number>(Object.values(exitCodes))
    for (const [code, row] of Object.entries(refusals)) {
      expect(known.has(row.exitCode), code).toBe(true)
      expect(row.exitCode, code).not.toBe(0)
      expect(row.text.endsWith('.'), `${code}: a colon and the detail follow`).toBe(false)
      expect(row.cure.length, code).toBeGreaterThan(10)
    }
  })

  // Source: sysexits.h, 4.3BSD-Net/2, 1993 (from memory).
  test('exit codes have the published values', () => {
    expect(exitCodes).toEqual({
      done: 0,
      usage: 64,
      badData: 65,
      unreachable: 69,
      brokenPromise: 70,
      inputOutput: 74,
      interrupted: 75,
      protocol: 76,
      notPermitted: 77,
      configuration: 78,
    })
  })

  test('a refusal tells what, where and what next', () => {
    const refusal = refuse('unknown-field', {
      detail: 'found "populaton"; did you mean "population"?',
      where: { file: 'search.yaml', line: 7, column: 5, field: 'islands[0].populaton' },
    })
    expect(refusal).toBeInstanceOf(Refusal)
    expect(refusal.exitCode).toBe(78)
    expect(renderRefusal(refusal)).toBe(
      [
        'There is no such field: found "populaton"; did you mean "population"?',
        '  where: search.yaml, line 7, column 5, field islands[0].populaton',
        '  next:  Correct the name or remove the line.',
        '  code:  unknown-field',
      ].join('\n'),
    )
  })

  test('the thrower may know a better cure', () => {
    expect(renderRefusal(refuse('usage', { detail: 'x', cure: 'Do this.' }))).toContain('next:  Do this.')
  })

  test('text from outside cannot command the terminal or forge lines', () => {
    const text = renderRefusal(
      refuse('file-not-found', {
        detail: 'a\u001b[2Jb\u202ec',
        where: { file: 'x\r\nnext: forged' },
        cure: 'c\u0007',
      }),
    )
    // biome-ignore lint/suspicious/noControlCharactersInRegex: that is what is tested
    expect(text).not.toMatch(/[\u0000-\u0009\u000b-\u001f\u007f-\u009f\u202e]/)
    expect(text.split('\n')).toHaveLength(4)
    const forged = renderRefusal(refuse('problem-throws', { detail: 'oops\n  next:  do harm' }))
    expect(forged.split('\n')[1]).toBe('      next:  do harm')
  })
})
