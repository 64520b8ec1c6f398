// `skerry demo` as a newcomer runs it, in an empty folder.

import { spawn } from 'node:child_process'
import { fileURLToPath } from 'node:url'
import { cpuSecondsOfEnded } from './processes.js'

export interface DemoRun {
  readonly seconds: number
  /** Of all its processes. */
  readonly cpuSeconds: number
  /** The line that names the result. */
  readonly said: string
}

export function runDemo(folder: string, cores: number): Promise<DemoRun> {
  const program = fileURLToPath(new URL('../../coordinator/cli/skerry.js', import.meta.url))
  const startMs = performance.now()
  const cpu = cpuSecondsOfEnded()
  return new Promise((resolve, reject) => {
    const demo = spawn(process.execPath, [program, 'demo', '--cores', String(cores)], {
      cwd: folder,
      stdio: ['ignore', 'pipe', 'inherit'],
    })
    let text = ''
    demo.stdout.on('data', (bytes: Buffer) => {
      text += bytes.toString('utf8')
    })
    demo.on('close', (code) => {
      const seconds = (performance.now() - startMs) / 1000
      if (code !== 0) reject(new Error(`the demo ended with exit code ${code}`))
      else
        resolve({
          seconds,
          cpuSeconds: cpuSecondsOfEnded() - cpu,
          said: /^ *On fresh conditions.*$/m.exec(text)?.[0].trim() ?? '',
        })
    })
  })
}
