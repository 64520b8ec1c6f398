import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { detMath } from './index.js'
import { highWord, lowWord, powerOfTwo, scaleByPowerOfTwo } from './words.js'

const inf = Number.POSITIVE_INFINITY

describe('detmath', () => {
  test('stands in for every name of the host that an older host has too', () => {
    const newer = ['f16round', 'sumPrecise']
    const names = Object.getOwnPropertyNames(Math).filter((name) => !newer.includes(name))
    expect(Object.keys(detMath).sort()).toEqual(names.sort())
  })

  test('no host function is handed on that hosts may round differently', () => {
    const exact = [
      'abs',
      'ceil',
      'clz32',
      'floor',
      'fround',
      'imul',
      'max',
      'min',
      'round',
      'sign',
      'sqrt',
      'trunc',
    ]
    for (const [name, value] of Object.entries(detMath)) {
      if (typeof value === 'function' && !exact.includes(name)) {
        expect(value, name).not.toBe((Math as unknown as { [name: string]: unknown })[name])
      }
    }
    expect(() => detMath.random()).toThrow('drawCondition')
  })

  // Source: ECMAScript 2023 (ECMA-262), section 21.3.2, special cases of each function.
  test('special cases are those of the language', () => {
    const edges = [
      NaN,
      0,
      -0,
      1,
      -1,
      0.5,
      -0.5,
      2,
      -2,
      3,
      -3,
      inf,
      -inf,
      5e-324,
      -5e-324,
      1.7976931348623157e308,
    ]
    edges.push(
      -1.7976931348623157e308,
      2.2250738585072014e-308,
      1e-320,
      710,
      -710,
      746,
      -746,
      9007199254740992,
      1e17 + 2,
    )
    const special = (x: number): boolean => !Number.isFinite(x) || x === 0 || Math.abs(x) === 1
    const host = Math as unknown as { readonly [name: string]: (...x: number[]) => number }
    for (const [name, f] of Object.entries(detMath)) {
      if (typeof f !== 'function' || name === 'random') continue
      const own = f as (...x: number[]) => number
      for (const x of edges) {
        for (const y of edges) {
          const given = own.length === 2 || name === 'hypot' ? [x, y] : [x]
          const expected = host[name]!(...given)
          if (special(expected)) expect(own(...given), `${name}(${given.join(', ')})`).toBe(expected)
        }
      }
    }
    expect(detMath.hypot()).toBe(0)
    expect(detMath.hypot(NaN, inf)).toBe(inf)
  })

  test('scaling by powers of two rounds once, down to the smallest number', () => {
    expect(scaleByPowerOfTwo(1, -1074)).toBe(5e-324)
    expect(scaleByPowerOfTwo(1.5, -1074)).toBe(1e-323)
    expect(scaleByPowerOfTwo(1 + 2 ** -52, -1075)).toBe(5e-324)
    expect(scaleByPowerOfTwo(1, -1075)).toBe(0)
    expect(scaleByPowerOfTwo(5e-324, 2097)).toBe(2 ** 1023)
    expect(scaleByPowerOfTwo(1, 1024)).toBe(inf)
    expect(scaleByPowerOfTwo(-1, -5000)).toBe(-0)
    // Three times a power of two has two bits: exact everywhere, subnormal numbers included.
    for (let n = -1074; n <= 1021; n++)
      expect(scaleByPowerOfTwo(3, n) / 3).toBe(n < -1022 ? 2 ** n : powerOfTwo(n))
  })

  test('words of a double are its bits on this processor', () => {
    const view = new DataView(new ArrayBuffer(8))
    fc.assert(
      fc.property(fc.double({ noNaN: true }), (x) => {
        view.setFloat64(0, x)
        expect(highWord(x)).toBe(view.getInt32(0))
        expect(lowWord(x)).toBe(view.getUint32(4))
      }),
      { seed: 1401 },
    )
  })

  test('symmetries hold to the last bit', () => {
    fc.assert(
      fc.property(fc.double({ noNaN: true }), (x) => {
        for (const f of [
          detMath.sin,
          detMath.tan,
          detMath.atan,
          detMath.tanh,
          detMath.sinh,
          detMath.cbrt,
          detMath.asinh,
        ]) {
          expect(f(-x)).toBe(-f(x))
        }
        expect(detMath.cos(-x)).toBe(detMath.cos(x))
        expect(detMath.cosh(-x)).toBe(detMath.cosh(x))
      }),
      { seed: 1402 },
    )
  })

  test('whole powers that can be exact are exact', () => {
    for (let n = 0; n <= 22; n++) {
      expect(detMath.pow(10, n)).toBe(Number(`1e${n}`))
      expect(detMath.log10(Number(`1e${n}`))).toBe(n)
    }
    for (let n = -1074; n <= 1023; n++) expect(detMath.log2(scaleByPowerOfTwo(1, n))).toBe(n)
    for (let n = 1; n <= 200; n++) expect(detMath.cbrt(n * n * n)).toBe(n)
    expect(detMath.hypot(3, 4)).toBe(5)
    expect(detMath.hypot(2, 3, 6)).toBe(7)
    expect(detMath.pow(-2, 3)).toBe(-8)
  })
})
