// A network of a test's own: a namespace in which its workers run, joined to this machine by a pair of interfaces that
// lose what the test tells them to.

import { execFileSync, spawnSync } from 'node:child_process'

const tools = ['ip', 'nft', 'tc']

/** Why no network can be made here; undefined when one can. */
export function cannotMakeNetworks(): string | undefined {
  if (process.getuid?.() !== 0) return 'networks of one’s own need root'
  const missing = tools.filter((tool) => spawnSync('sh', ['-c', `command -v ${tool}`]).status !== 0)
  return missing.length === 0 ? undefined : `not installed: ${missing.join(', ')}`
}

export class Network {
  /** Address of this machine, as seen from inside. */
  readonly address: string
  private readonly name = `skerry-${process.pid}`
  private readonly outer = `sk${process.pid}`

  constructor() {
    const part = 1 + (process.pid % 250)
    this.address = `10.231.${part}.1`
    const inner = `${this.outer}i`
    run('ip', 'netns', 'add', this.name)
    try {
      run('ip', 'link', 'add', this.outer, 'type', 'veth', 'peer', 'name', inner, 'netns', this.name)
      run('ip', 'address', 'add', `${this.address}/24`, 'dev', this.outer)
      run('ip', 'link', 'set', this.outer, 'up')
      this.inside('ip', 'address', 'add', `10.231.${part}.2/24`, 'dev', inner)
      this.inside('ip', 'link', 'set', inner, 'up')
      this.inside('ip', 'link', 'set', 'lo', 'up')
    } catch (error) {
      this.close()
      throw error
    }
  }

  /** Words before a command that shall run inside. */
  get prefix(): readonly string[] {
    return ['ip', 'netns', 'exec', this.name]
  }

  /** Every packet is lost with this chance in 100, by direction as seen from inside. */
  lose(percent: { readonly out: number; readonly in: number }): void {
    this.heal()
    const verdict = (chance: number) =>
      chance === 0 ? '' : chance === 100 ? 'drop;' : `numgen random mod 100 < ${chance} drop;`
    const chain = (hook: string, chance: number) =>
      `chain ${hook} { type filter hook ${hook} priority 0; ${verdict(chance)} }\n`
    const rules = `table inet weather {\n${chain('output', percent.out)}${chain('input', percent.in)}}`
    this.inside('nft', rules)
  }

  heal(): void {
    spawnSync('ip', [...this.prefix.slice(1), 'nft', 'delete', 'table', 'inet', 'weather'])
  }

  /** At most so many bits a second into the namespace. */
  throttle(rate: string): void {
    const limit = ['rate', rate, 'burst', '5kb', 'latency', '400ms']
    run('tc', 'qdisc', 'add', 'dev', this.outer, 'root', 'tbf', ...limit)
  }

  close(): void {
    spawnSync('ip', ['link', 'del', this.outer])
    spawnSync('ip', ['netns', 'del', this.name])
  }

  private inside(...words: string[]): void {
    const [command = '', ...rest] = [...this.prefix, ...words]
    run(command, ...rest)
  }
}

function run(command: string, ...words: string[]): void {
  execFileSync(command, words, { stdio: ['ignore', 'ignore', 'pipe'] })
}
