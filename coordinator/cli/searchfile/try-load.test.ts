// What a plug-in may do while it is loaded without taking the coordinator along.

import { describe, expect, it } from 'vitest'
import type { Refusal } from '../../../shared/refusals.js'
import { tryLoad } from './try-load.js'

const small = { seconds: 1, megabytes: 32 }
const refusal = (code: string, limits = small) =>
  tryLoad(code, limits).then(
    () => undefined,
    (error: Refusal) => `${error.code} ${error.detail}`,
  )

describe('loading a plug-in on trial', () => {
  it('lets pass what loads, prints, or throws by itself', async () => {
    expect(await refusal('export default 1', { seconds: 20, megabytes: 64 })).toBeUndefined()
    expect(
      await refusal('console.log("loud"); export default 1', { seconds: 20, megabytes: 64 }),
    ).toBeUndefined()
    expect(await refusal('throw new Error("boom")', { seconds: 20, megabytes: 64 })).toBeUndefined()
  })
  it('refuses a loop', async () => {
    expect(await refusal('for (;;);')).toBe('problem-throws while it was loaded: it was not done after 1 s.')
  })
  it('refuses what ends the process, with the code', async () => {
    expect(await refusal('process.exit(5)', { seconds: 20, megabytes: 64 })).toContain(
      'it ended the process with exit code 5',
    )
    expect(await refusal('process.exit(0)', { seconds: 20, megabytes: 64 })).toContain('process.exit')
  })
  it('refuses what eats memory', async () => {
    const eater = 'const kept = []; for (;;) kept.push(new Array(1e5).fill(kept.length))'
    expect(await refusal(eater, { seconds: 20, megabytes: 32 })).toContain(
      'it needs more than 32 MB of memory',
    )
  })
  it('refuses a wait that never ends', async () => {
    expect(
      await refusal('await new Promise(() => {}); export default 1', { seconds: 20, megabytes: 64 }),
    ).toContain('top-level await')
  })
})
