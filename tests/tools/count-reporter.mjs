// A vitest reporter that only counts, for run-tests.mjs: passed, failed and skipped tests by name, and errors
// outside any test, as one JSON file. The file's absence means that vitest never got to its end.

import { writeFileSync } from 'node:fs'
import { relative } from 'node:path'

export default class CountReporter {
  onTestRunEnd(modules, unhandledErrors, reason) {
    const counts = { passed: 0, failed: [], skipped: [], reason }
    for (const module of modules) {
      const file = relative(process.cwd(), module.moduleId)
      // A file that does not load has no tests of its own, but it has errors.
      for (const error of module.errors()) counts.failed.push(`${file}: ${error.message.split('\n')[0]}`)
      for (const test of module.children.allTests()) {
        const { state, note } = test.result()
        const name = `${file} > ${test.fullName}`
        if (state === 'passed') counts.passed += 1
        else if (state === 'skipped')
          counts.skipped.push({ name, note: note ?? `${test.options.mode ?? 'skipped'}, no reason given` })
        else counts.failed.push(name)
      }
    }
    for (const error of unhandledErrors)
      counts.failed.push(`outside any test: ${error.message?.split('\n')[0]}`)
    writeFileSync(process.env.SKERRY_TEST_COUNTS, JSON.stringify(counts))
  }
}
