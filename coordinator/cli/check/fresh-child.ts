// The fresh process of `check` (see fresh.ts): reads one order, simulates, answers, ends. Standard output is the answer alone:
// whatever the problem prints goes to standard error.

import { genomeFromBytes } from '../../../shared/encodings.js'
import { loadPlugin } from '../../../worker/plugin/load.js'
import type { FreshOrder } from './fresh.js'
import { evaluateOnce } from './trials.js'
import { packValues } from './trials-wire.js'

console.log = console.error
console.info = console.error
let text = ''
for await (const chunk of process.stdin) text += String(chunk)
const order = JSON.parse(text) as FreshOrder
const problem = await loadPlugin({ file: order.bundle })
const answer = order.machines.map(({ number, genome }) => {
  const bytes = new Uint8Array(Buffer.from(genome, 'base64'))
  const { values, failures } = evaluateOnce(
    problem,
    order.plan,
    genomeFromBytes(problem.genome, bytes),
    number,
  )
  return { number, values: packValues(values), failures }
})
process.stdout.write(JSON.stringify(answer))
