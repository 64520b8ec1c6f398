import { describe, expect, test } from 'vitest'
import { checkSettings, choiceSetting, defaultSettings, numberSetting, SettingFault } from './settings.js'
import type { SettingTable } from './types.js'

const table: SettingTable = {
  rate: { kind: 'number', default: 0.5, low: 0, high: 1, help: 'a share' },
  size: { kind: 'integer', default: 2, low: 1, high: 9, help: 'a count' },
  rule: { kind: 'choice', default: 'worst', options: ['worst', 'oldest'], help: 'a word' },
}

describe('settings', () => {
  test('what is not given has its default', () => {
    expect(checkSettings(table, {})).toEqual({ rate: 0.5, size: 2, rule: 'worst' })
    expect(checkSettings(table, {})).toEqual(defaultSettings(table))
    expect(checkSettings(table, { size: 9, rule: 'oldest' })).toEqual({ rate: 0.5, size: 9, rule: 'oldest' })
  })
  const faults: [string, unknown, string, string][] = [
    ['rate', 1.5, '1.5', 'a number from 0 to 1'],
    ['rate', '0.5', "'0.5'", 'a number from 0 to 1'],
    ['rate', Number.NaN, 'NaN', 'a number from 0 to 1'],
    ['size', 2.5, '2.5', 'a whole number from 1 to 9'],
    ['size', 10, '10', 'a whole number from 1 to 9'],
    ['rule', 'best', "'best'", 'one of worst, oldest'],
    ['rule', ['worst'], 'a list', 'one of worst, oldest'],
    ['rule', { a: 1 }, 'a mapping', 'one of worst, oldest'],
    ['rule', null, 'null', 'one of worst, oldest'],
    ['sizes', 2, 'an unknown setting', 'one of rate, size, rule'],
    ['toString', 2, 'an unknown setting', 'one of rate, size, rule'],
  ]
  for (const [field, value, found, expected] of faults) {
    test(`${field}: ${JSON.stringify(value)} is answered with what was expected`, () => {
      expect(checkSettings(table, { [field]: value })).toEqual(new SettingFault(field, found, expected))
    })
  }
  test('reading a setting as another kind is a broken promise', () => {
    const settings = defaultSettings(table)
    expect(numberSetting(settings, 'rate')).toBe(0.5)
    expect(choiceSetting(settings, 'rule')).toBe('worst')
    expect(() => numberSetting(settings, 'rule')).toThrow('setting rule is a number')
    expect(() => choiceSetting(settings, 'size')).toThrow('setting size is a choice')
  })
})
