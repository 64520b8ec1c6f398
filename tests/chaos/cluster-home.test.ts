// Promise: a search at home on nodes that are taken away. The coordinator brings its Redis and keeps its work copy on
// the node's own disk; the node is lost with that disk, another one goes on from the shared folder, workers follow, and
// the digest is that of a calm day. Nodes are namespaces: each has a host name and a disk (tmpfs) of its own, which are
// gone with its last process.

import { spawnSync } from 'node:child_process'
import { mkdirSync, readdirSync } from 'node:fs'
import { join } from 'node:path'
import { expect, it } from 'vitest'
import { ensureBuilt } from '../tools/built.js'
import { pause } from '../tools/redis-server.js'
import { Bench, hears, type Life, program, reportOf, searchOf, waitingProblem } from './programs.js'

const scale = 0.2
const record = 'shared/weir'
const asNode = ['--mount', '--uts', ...(process.getuid?.() === 0 ? [] : ['--user', '--map-root-user'])]
const prepare = 'mount -t tmpfs tmpfs "$1" && hostname "$2" && shift 2 && exec "$@"'

function cannotMakeNodes(): string | undefined {
  const tried = spawnSync('unshare', [...asNode, 'sh', '-c', 'mount -t tmpfs tmpfs /mnt && hostname node'])
  return tried.status === 0 ? undefined : 'no namespaces of one’s own here (unshare --mount --uts)'
}

/** The coordinator on a node of this name. */
function coordinator(bench: Bench, node: string): Life {
  const scratch = join(bench.folder, `disk-of-${node}`)
  mkdirSync(scratch)
  const run = ['run', 'search.yaml', '--json', '--record', record, '--scratch', scratch]
  const words = [process.execPath, program, ...run, '--own-redis', '--address', '127.0.0.1']
  return bench.startCommand('unshare', [...asNode, 'sh', '-c', prepare, 'sh', scratch, node, ...words])
}

it('(1, 10) the node of the coordinator is lost with its disk: another goes on, workers follow, same digest', async (context) => {
  const reason = cannotMakeNodes()
  if (reason !== undefined) return context.skip(reason)
  ensureBuilt()
  const bench = new Bench(scale)
  try {
    bench.write('problem.js', waitingProblem(6))
    bench.write('search.yaml', searchOf(1000))
    const calm = bench.run('records/calm', ['--cores', '1']).ended
    const first = coordinator(bench, 'node-a')
    const workers = ['h1', 'h2', 'h3'].map((host) => {
      const words = ['work', '--record', record, '--host', host, '--cores', '1']
      return bench.start([...words, '--cache', join(bench.folder, `cache-${host}`)])
    })
    while (bench.committed(record) < 100) {
      if (first.isOver) throw new Error(first.said())
      await pause(50)
    }
    first.kill('SIGKILL')
    await first.ended
    expect(readdirSync(join(bench.folder, 'disk-of-node-a'))).toEqual([])

    const second = coordinator(bench, 'node-b')
    await hears(second, /held on another machine/)
    await hears(second, /Continued: \d+ commits/)
    const { code, out, err } = await second.ended
    expect(code, err).toBe(0)
    const reference = await calm
    expect(reference.code, reference.err).toBe(0)
    expect(reportOf(out)).toEqual(reportOf(reference.out))
    for (const worker of workers) expect(worker.isOver, worker.said()).toBe(false)
  } finally {
    await bench.close()
  }
})
