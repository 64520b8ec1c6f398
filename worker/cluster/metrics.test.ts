import { get } from 'node:http'
import { expect, test } from 'vitest'
import { scene } from '../../tests/agent-fixture.js'
import { freePort } from '../../tests/tools/redis-server.js'
import { metricRows, metricsText, serveMetrics } from './metrics.js'

function ask(
  port: number,
  path: string,
  host?: string,
): Promise<{ readonly status: number; readonly text: string }> {
  return new Promise((resolve, reject) => {
    const headers = host === undefined ? {} : { host }
    get({ port, path, headers, host: '127.0.0.1' }, (response) => {
      let text = ''
      response.on('data', (bytes: Buffer) => {
        text += bytes.toString()
      })
      response.on('end', () => resolve({ status: response.statusCode ?? 0, text }))
    }).on('error', reject)
  })
}

// Names, units and the text: Prometheus documentation, Metric and label naming; Exposition formats, version 0.0.4
// (from memory).
test('every figure has a name in base units, its kind and one line of help, and is given once', () => {
  const { agent, stop } = scene()
  stop()
  const lines = metricsText(agent).trimEnd().split('\n')
  for (const { name, kind, unit, help } of metricRows) {
    expect(name).toMatch(/^[a-z][a-z_]*$/)
    expect(name.endsWith('_total')).toBe(kind === 'counter')
    if (unit !== '1') expect(name.replace(/_total$/, '').endsWith(`_${unit}`)).toBe(true)
    expect(help).not.toContain('\n')
    expect(lines.filter((line) => line === `# TYPE skerry_worker_${name} ${kind}`)).toHaveLength(1)
  }
  const values = lines.filter((line) => !line.startsWith('#'))
  for (const line of values)
    expect(line).toMatch(/^skerry_worker_[a-z_]+(\{[a-z]+="[^"]*"(,[a-z]+="[^"]*")*\})? [\d.e+-]+$/)
  expect(values).toContain('skerry_worker_cores 2')
  expect(values.filter((line) => line.startsWith('skerry_worker_state') && line.endsWith(' 1'))).toHaveLength(
    1,
  )
})

test('a name with quotes and line ends cannot break the text', () => {
  const { agent, stop } = scene({ host: 'a"b\\c\nd' })
  stop()
  expect(metricsText(agent)).toContain('host="a\\"b\\\\c\\nd"')
})

test('served on this machine only, under one path, to nobody who calls it by another name', async () => {
  const { agent, stop } = scene()
  stop()
  const port = await freePort()
  const close = await serveMetrics(port, agent)
  expect((await ask(port, '/metrics')).text).toContain('skerry_worker_info{agent="host-a-1-abcd"')
  expect((await ask(port, '/')).status).toBe(404)
  expect((await ask(port, '/metrics', 'elsewhere.example')).status).toBe(403)
  await expect(serveMetrics(port, agent)).rejects.toThrow(`no metrics can be served on port ${port}`)
  close()
})
