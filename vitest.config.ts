import { defineConfig } from 'vitest/config'

// One project a phase of `npm test` (tests/tools/phases.mjs); a house test holds that every test file is in
// exactly one of them. `npx vitest run PATH` runs part of any.

const seconds = 1000
const shared = { environment: 'node' as const, testTimeout: 30 * seconds, hookTimeout: 30 * seconds }
const long = { ...shared, testTimeout: 600 * seconds, hookTimeout: 120 * seconds }

export default defineConfig({
  test: {
    watch: false,
    pool: 'forks',
    maxWorkers: 2,
    projects: [
      { test: { ...shared, name: 'house', include: ['tests/house/**/*.test.ts'] } },
      {
        test: {
          ...shared,
          name: 'unit',
          include: ['{shared,sim,worker,coordinator}/**/*.test.ts', 'tests/{reference,tools}/**/*.test.ts'],
        },
      },
      { test: { ...long, name: 'kernel', include: ['tests/kernel/**/*.test.ts'], fileParallelism: false } },
      {
        test: {
          ...long,
          name: 'determinism',
          include: ['tests/determinism/**/*.test.ts'],
          fileParallelism: false,
        },
      },
      { test: { ...long, name: 'contract', include: ['tests/contract/**/*.test.ts'] } },
      { test: { ...long, name: 'queue', include: ['tests/queue/**/*.test.ts'], fileParallelism: false } },
      { test: { ...long, name: 'cluster', include: ['tests/cluster/**/*.test.ts'] } },
      { test: { ...long, name: 'chaos', include: ['tests/chaos/**/*.test.ts'], fileParallelism: false } },
      { test: { ...long, name: 'package', include: ['tests/package/**/*.test.ts'] } },
      { test: { ...long, name: 'browser', include: ['tests/browser/**/*.test.ts'] } },
    ],
  },
})
