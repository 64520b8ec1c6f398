// A coordinator in a process of its own, for tests of who may write: opens the record, appends one result after
// the other and says how far it is. Ends with the exit code of the refusal that ends it.

import { randomBytes } from 'node:crypto'
import { mayTryAgain, openRecord, thisProcess } from '../../coordinator/record/index.js'
import { Refusal } from '../../shared/refusals.js'
import { arrival, good, pinned, rows } from './record-fixture.js'

const [folder, takeover] = process.argv.slice(2)

function say(word: string, value: unknown): void {
  process.stdout.write(`${word} ${JSON.stringify(value)}\n`)
}

try {
  const record = openRecord(folder!, {
    holder: thisProcess(),
    nonce: randomBytes(16).toString('hex'),
    clock: () => Date.now(),
    ...(takeover === 'create' ? { create: pinned() } : {}),
    takeover: takeover === 'force' ? 'force' : 'if-dead',
  })
  say('open', { epoch: record.epoch, notices: record.notices, appends: record.reader.totals().appends })
  const worker = `writer-${record.epoch}`
  let next = [...record.reader.arrivals(record.epoch)].length + 1
  const step = (): void => {
    record.journal.append(rows({ arrivals: [arrival(record.epoch, next, good(next), { worker })] }))
    say('acknowledged', next)
    next += 1
    setImmediate(run)
  }
  const run = (): void => {
    try {
      step()
    } catch (error) {
      if (error instanceof Refusal && mayTryAgain(error)) setTimeout(run, 5)
      else end(error)
    }
  }
  run()
} catch (error) {
  end(error)
}

function end(error: unknown): void {
  if (!(error instanceof Refusal)) throw error
  say('refused', { code: error.code, detail: error.detail })
  process.exitCode = error.exitCode
}
