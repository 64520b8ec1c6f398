// Search files whose problem is missing, broken or dishonest, through the same door that run and check use.

import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, describe, expect, it } from 'vitest'
import { checkSearch } from '../../coordinator/cli/check.js'
import { demoProblemText, demoSearchText } from '../../coordinator/cli/demo.js'
import { problemText, searchText } from '../../coordinator/cli/new-files.js'
import { searchTables } from '../../coordinator/cli/search-tables.js'
import { openSearch } from '../../coordinator/cli/searchfile/open.js'
import { type Refusal, renderRefusal } from '../../shared/refusals.js'

const root = mkdtempSync(join(tmpdir(), 'skerry-searchfile-'))
afterAll(() => rmSync(root, { recursive: true, force: true }))

let folders = 0
/** A folder with a search file as `skerry new` writes it and this problem; answers the path of the search file. */
function folderWith(problem: string | undefined, search = searchText('mount', 4)): string {
  const folder = join(root, String(++folders))
  mkdirSync(folder)
  writeFileSync(join(folder, 'search.yaml'), search)
  if (problem !== undefined) writeFileSync(join(folder, 'problem.ts'), problem)
  return join(folder, 'search.yaml')
}
async function refusal(file: string): Promise<Refusal> {
  return openSearch(file, searchTables()).then(
    () => Promise.reject(new Error('it was not refused')),
    (error: Refusal) => error,
  )
}

describe('what `skerry new` writes', () => {
  it('opens without a warning', async () => {
    for (const workers of [1, 200]) {
      const opened = await openSearch(folderWith(problemText, searchText('mount', workers)), searchTables())
      expect(opened.warnings, `for ${workers} workers`).toEqual([])
      expect(opened.plan.problem.name).toBe('gauge-mount')
    }
  })
  it('passes check, in a fresh process too', async () => {
    const opened = await openSearch(folderWith(problemText), searchTables())
    const report = await checkSearch(opened, { machines: 3, secondsMost: 10 })
    expect(report.faults).toEqual([])
    expect(report.freshNotRun).toBeUndefined()
    expect(report.ok).toBe(true)
    expect(report.making).toMatchObject({ founders: 64, cannot: 0 })
    expect(report.cautions.hazards).toContain('Mount failing on a running machine')
    expect(report.cautions.notDeclared).toEqual([])
    const { coreHours, memory } = report.measured!
    expect(coreHours.total).toBeGreaterThan(coreHours.search)
    expect(memory.peakBytes).toBeGreaterThan(10e6)
    expect(memory.keptBytesPerSimulation).toBeLessThan(20_000)
  })
})

describe('a problem that says what a simulation needs', () => {
  const asking = problemText.replace(
    "version: '1',",
    "version: '1', needs: { cores: 2, tokens: { flow: 1 } },",
  )
  const here = `${searchText('mount', 4)}\ntokens: { flow: 3 }\ncores: 7\n`
  it('has it in its plan and in the report, with how many run at once and two core-hours an hour', async () => {
    const opened = await openSearch(folderWith(asking, here), searchTables())
    expect(opened.plan.problem.needs).toEqual({ cores: 2, memoryMB: 1024, tokens: { flow: 1 } })
    const report = await checkSearch(opened, { machines: 2, secondsMost: 10 })
    expect(report.needs).toMatchObject({ cores: 2, tokens: { flow: 1 } })
    // Three by cores and licences; fewer where this machine has less memory than 3 GB.
    expect(report.needs!.atOnceHere).toBeLessThanOrEqual(3)
    expect(report.needs!.atOnceHere).toBeGreaterThanOrEqual(1)
    const { coreHours, secondsPerSimulation } = report.measured!
    const hours = (opened.plan.budget.simulations * secondsPerSimulation.mean) / 3600
    expect(coreHours.search / hours).toBeCloseTo(2, 9)
  })
  it('is refused with a search file that names no such licence', async () => {
    expect((await refusal(folderWith(asking))).message).toContain('flow')
  })
})

describe('a problem that takes its process along', () => {
  const rest = (inSimulate: string) => `
import { defineProblem, real } from 'skerry'
export default defineProblem({
  name: 'probe', version: '1', summary: 'a problem that does what the test is about',
  genome: { x: real({ length: 1, low: 0, high: 1 }) },
  objectives: { shaking: { direction: 'minimise', unit: 'm/s2' } },
  drawCondition: () => 0,
  simulate: (genome, situations) => {
    ${inSimulate}
    return situations.map(() => ({ objectives: { shaking: genome.x[0] } }))
  },
})
`
  const faultOf = async (inSimulate: string, waitSeconds = 60) => {
    const opened = await openSearch(folderWith(rest(inSimulate)), searchTables())
    const report = await checkSearch(opened, { machines: 3, secondsMost: 10, waitSeconds })
    expect(report.ok).toBe(false)
    expect(report.measured).toBeUndefined()
    return report.faults[0]!.sentence
  }
  it('by ending it is named with the exit code and the machine', async () => {
    expect(await faultOf('process.exit(3)')).toBe(
      'it ended its process (exit code 3) while machine 1 was being simulated.',
    )
  })
  it('by hanging is given up after the time that was asked for', async () => {
    expect(await faultOf('for (;;);', 3)).toBe(
      'it was not done after 3 s (--wait N waits longer), while machine 1 was being simulated.',
    )
  })
  it('by looping while it is loaded is refused', async () => {
    const loops = `process.exit(7)\n${rest('')}`
    expect(renderRefusal(await refusal(folderWith(loops)))).toContain('it ended the process with exit code 7')
  })
  it('by keeping memory is found out', async () => {
    const leak = rest('kept.push(new Float64Array(20_000))').replace('export', 'const kept = []\nexport')
    const opened = await openSearch(folderWith(leak), searchTables())
    const { measured } = await checkSearch(opened, { machines: 2, secondsMost: 10 })
    // Three cases of the fixture would share an array; this problem has none: 160 kB for two replicates.
    expect(measured!.memory.keptBytesPerSimulation).toBeGreaterThan(60_000)
  })
})

describe('the search of `skerry demo`', () => {
  it('opens without a warning', async () => {
    const file = folderWith(undefined, demoSearchText)
    writeFileSync(join(file, '..', 'problem.js'), demoProblemText)
    const opened = await openSearch(file, searchTables())
    expect(opened.warnings).toEqual([])
    expect(opened.plan.problem.name).toBe('culvert-crawler')
  })
})

describe('a search file that is not there', () => {
  it('is refused by its name', async () => {
    expect(await refusal(join(root, 'none.yaml'))).toMatchObject({ code: 'file-not-found', exitCode: 78 })
  })
  it('is refused when it is a folder', async () => {
    expect(await refusal(root)).toMatchObject({ code: 'file-unreadable' })
  })
})

describe('a problem', () => {
  it('that is missing is refused at the line of the search file that names it', async () => {
    const file = folderWith(problemText, searchText('mount', 4).replace('./problem.ts', './problm.ts'))
    const refused = await refusal(file)
    expect(refused).toMatchObject({
      code: 'problem-not-found',
      where: { file, field: 'problem', line: 6, column: 10 },
    })
    expect(renderRefusal(refused)).toContain('problem.ts')
  })
  it('that throws while it is loaded is refused with its words', async () => {
    const refused = await refusal(folderWith('throw new Error("the pump is not on the list")\n'))
    expect(refused.code).toBe('problem-throws')
    expect(renderRefusal(refused)).toContain('the pump is not on the list')
  })
  it('that has a syntax error is refused with its own line and column', async () => {
    const refused = await refusal(folderWith('export default {\n  name: ,\n}\n'))
    expect(refused).toMatchObject({ code: 'problem-does-not-bundle', where: { line: 2 } })
  })
  it('that exports no problem is refused', async () => {
    expect((await refusal(folderWith('export const nothing = 1\n'))).exitCode).toBe(78)
  })
  it('that is missing does not hide mistakes of the search file', async () => {
    const text = searchText('mount', 4)
      .replace('topology: ring', 'topology: rign')
      .replace('seed: 1 ', 'seed: one ')
    const printed = renderRefusal(await refusal(folderWith(undefined, text)))
    expect(printed).toContain('Did you mean "ring"?')
    expect(printed).toContain('the text "one"')
    expect(printed).toMatch(/search\.yaml:6:10 {2}refused: problem/)
  })
  it('whose clock makes it differ between processes is found by check', async () => {
    // The time a module was loaded differs between any two processes; plug-ins are not given a clock, so it is smuggled in.
    const smuggled = problemText
      .replace(
        'import { choice,',
        "const loaded = Number(String(new Error('x').stack?.length ?? 0))\nimport { choice,",
      )
      .replace('travel: travelM,', 'travel: travelM * (1 + loaded * 2 ** -52),')
    const opened = await openSearch(folderWith(smuggled), searchTables())
    const report = await checkSearch(opened, { machines: 2, secondsMost: 10 })
    expect(report.freshNotRun).toBeUndefined()
    expect(report.ok).toBe(false)
    expect(report.faults[0]?.sentence).toMatch(/travel of machine \d .* ulp in a fresh process/)
  })
})
