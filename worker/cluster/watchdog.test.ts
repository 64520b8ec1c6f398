import { expect, test } from 'vitest'
import { Watchdog } from './watchdog.js'

/** Looks every half second for so long; the first moment at which it had enough. */
function watched(seconds: number, could: (second: number) => boolean, tookAt?: number): number | undefined {
  const dog = new Watchdog(60_000)
  for (let ms = 0; ms <= seconds * 1000; ms += 500) {
    if (ms / 1000 === tookAt) dog.took()
    if (dog.look(ms, could(ms / 1000))) return ms / 1000
  }
  return undefined
}

test('work waits, nothing is taken: enough after 60 s', () => {
  expect(watched(100, () => true)).toBe(60)
})
test('something taken meanwhile starts the time again', () => {
  expect(watched(100, () => true, 30)).toBe(89.5)
})
test('a moment without waiting work, room or connection starts it again', () => {
  expect(watched(100, (second) => second !== 50)).toBeUndefined()
})
test('a process that was stopped for an hour is not taken for one that idles', () => {
  const dog = new Watchdog(60_000)
  expect(dog.look(0, true)).toBe(false)
  expect(dog.look(3_600_000, true)).toBe(false)
  expect(dog.look(3_600_500, true)).toBe(false)
})
