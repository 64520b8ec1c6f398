// How a running search looks in a terminal: one sentence of state, one line an island with the level of its
// quota, the best so far, the rate. Drawn as text lines by a pure function; LiveBlock redraws them in place. In a
// log the same facts are one line each time. Nothing is said by colour alone; emphasis is bold at most.

import type { Output } from './command.js'
import { counted, duration, estimate, grouped, percent, short } from './numbers.js'
import type { BestView, IslandView, ProgressView } from './progress-view.js'

export interface DrawOptions {
  readonly columns: number
  readonly unicode: boolean
  /** Lines of islands shown; more are summed up. */
  readonly islandsMost: number
  /** Time of day at which the search will end, from seconds left; absent where there is no clock. */
  readonly clockAfter?: (seconds: number) => string
}

const narrowest = 60
const widest = 200

/** The live block, one string a line, none wider than `columns`. */
export function drawProgress(view: ProgressView, options: DrawOptions): string[] {
  const columns = Math.min(widest, Math.max(narrowest, options.columns))
  const lines = [
    ...wrap(stateSentence(view, options), columns),
    '',
    ...islandLines(view, { ...options, columns }),
    '',
    ...labelled('best', bestSentence(view.best), columns),
    ...labelled('work', workSentence(view), columns),
    ...labelled('purity', puritySentence(view), columns),
    ...labelled('digest', view.digest.slice(0, 16), columns),
  ]
  const plain = options.unicode ? lines : lines.map((line) => line.replaceAll('±', '+-'))
  return plain.map((line) => (line.length > columns ? `${line.slice(0, columns - 3)}...` : line))
}

const stateWords: { readonly [state in ProgressView['state']]: string } = {
  new: 'has not begun',
  searching: 'is searching',
  paused: 'is paused',
  stopped: 'has stopped before its end',
  finished: 'is finished',
}

/** culvert-crawler is searching: 12,480 of 200,000 simulations (6.2 %), about 3 h 12 min to go, ending about 18:40. */
export function stateSentence(view: ProgressView, options: Pick<DrawOptions, 'clockAfter'>): string {
  const done = `${grouped(view.simulations)} of ${grouped(view.budget)} simulations (${percent(view.simulations / view.budget)})`
  const because = view.because ? ` (${view.because})` : ''
  const left = view.rate?.secondsLeft
  const clock = left === undefined ? undefined : options.clockAfter?.(left)
  const until =
    left === undefined || view.state !== 'searching'
      ? ''
      : `, about ${duration(left)} to go${clock ? `, ending about ${clock}` : ''}`
  return `${view.name} ${stateWords[view.state]}${because}: ${done}${until}.`
}

function islandLines(view: ProgressView, options: DrawOptions): string[] {
  const all = [...view.islands, ...view.controls]
  const shown = all.slice(0, options.islandsMost)
  const nameWidth = Math.max(...shown.map(({ name }) => name.length), 2)
  const methodWidth = Math.min(20, Math.max(...shown.map((island) => methodWords(island).length), 6))
  const notes = shown.map((island) => islandNote(island))
  const noteWidth = Math.min(40, Math.max(...notes.map((note) => note.length), 0))
  const barWidth = Math.min(48, options.columns - 2 - nameWidth - 2 - methodWidth - 2 - 2 - 5 - 2 - noteWidth)
  const lines = shown.map((island, index) => {
    const fraction = island.quota > 0 ? island.simulations / island.quota : 1
    const bar = barWidth >= 6 ? `  ${level(fraction, barWidth, options.unicode)}` : ''
    const method = fit(methodWords(island), methodWidth)
    return `  ${island.name.padEnd(nameWidth)}  ${method}${bar} ${percent(fraction).padStart(6)}  ${notes[index]}`.trimEnd()
  })
  if (all.length > shown.length) lines.push(`  and ${counted(all.length - shown.length, 'more island')}`)
  return lines
}

function methodWords(island: IslandView): string {
  return island.name.startsWith('c') ? `${island.method}, control` : island.method
}

function islandNote(island: IslandView): string {
  if (island.state === 'ended') return island.because ?? 'ended'
  if (island.state === 'waiting') return island.because ? `waits ${island.because}` : 'waits'
  const first = island.best?.estimates[0]
  return first
    ? `best ${estimate(first.value, first.unit, first.standardError)} (n ${island.best!.replicates})`
    : 'no result yet'
}

/** A filled channel: how far a quota is used. */
export function level(fraction: number, width: number, unicode: boolean): string {
  const filled = Math.min(width, Math.max(0, Math.floor(fraction * width)))
  const [full, empty] = unicode ? ['▆', '▁'] : ['o', '.']
  return full!.repeat(filled) + empty!.repeat(width - filled)
}

function bestSentence(best: BestView | undefined): string {
  if (!best) return 'no result yet'
  const numbers = best.estimates
    .map(
      ({ objective, value, unit, standardError }) => `${objective} ${estimate(value, unit, standardError)}`,
    )
    .join(', ')
  const sample = `mean of ${counted(best.replicates, 'replicate')}`
  const byOne = best.confirmedBy === 'process' ? ', confirmed on one machine only' : ''
  const confirmed = best.confirmed ? byOne : ', not confirmed yet'
  return `${best.id}: ${numbers} (${sample}${confirmed}; chosen for being best, so fresh tests will on average be worse)`
}

function workSentence(view: ProgressView): string {
  const { rate } = view
  const speed = rate
    ? `${short(rate.simulationsPerSecond)} simulations/s on ${counted(rate.cores, 'core')}, busy ${percent(rate.busyFraction)}; `
    : ''
  const waiting = view.proposed - view.committed
  const troubles = `${counted(view.failedSimulations, 'failed simulation')}, ${grouped(view.setAside)} set aside`
  return `${speed}${grouped(view.committed)} evaluations committed, ${grouped(waiting)} under way; ${troubles}`
}

function puritySentence(view: ProgressView): string {
  return view.purity === 'none' ? 'nothing but its own rules entered this search' : view.purity.join('; ')
}

/** One line for a log. */
export function logLine(view: ProgressView, time: string): string {
  const first = view.best?.estimates[0]
  const best = first
    ? `, best ${view.best!.id} ${first.objective} ${estimate(first.value, first.unit, first.standardError)} (${counted(view.best!.replicates, 'replicate')})`
    : ''
  const isMoving = view.state === 'searching'
  const rate = view.rate && isMoving ? `, ${short(view.rate.simulationsPerSecond)}/s` : ''
  const left =
    view.rate?.secondsLeft === undefined || !isMoving ? '' : `, ${duration(view.rate.secondsLeft)} to go`
  const done = `${grouped(view.simulations)} of ${grouped(view.budget)} simulations`
  const because = view.because ? ` (${view.because})` : ''
  const failed = view.failedSimulations > 0 ? `, ${grouped(view.failedSimulations)} failed` : ''
  return `${time}  ${view.state}${because}: ${done}${failed}${rate}${left}${best}`
}

function labelled(label: string, text: string, columns: number): string[] {
  const width = 8
  const lines = wrap(text, columns - width - 2)
  return lines.map((line, index) => `  ${(index === 0 ? label : '').padEnd(width)}${line}`)
}

function fit(text: string, width: number): string {
  return text.length > width ? `${text.slice(0, width - 2)}..` : text.padEnd(width)
}

/** Breaks at spaces; a word wider than a line stays whole. */
export function wrap(text: string, width: number): string[] {
  const lines: string[] = []
  let line = ''
  for (const word of text.split(' ')) {
    if (line !== '' && line.length + 1 + word.length > width) {
      lines.push(line)
      line = word
    } else line = line === '' ? word : `${line} ${word}`
  }
  return [...lines, line]
}

/** A line broken at spaces to fit, its indentation kept. */
export function fitted(line: string, columns: number): string {
  const indent = /^ */.exec(line)![0]
  if (line.length <= columns) return line
  return wrap(line.slice(indent.length), Math.max(20, columns - indent.length))
    .map((part) => indent + part)
    .join('\n')
}

/** Lines at the bottom of a terminal that are redrawn in place; what is printed goes above them. */
export class LiveBlock {
  readonly #output: Output
  #lines: readonly string[] = []

  constructor(output: Output) {
    this.#output = output
  }

  /** One write, so that nothing flickers: cursor up, each line cleared, the rest of the old block cleared. */
  draw(lines: readonly string[]): void {
    const body = lines.map((line) => `${line}\u001b[K\n`).join('')
    this.#output.raw(`${this.#up()}${body}\u001b[J`)
    this.#lines = lines
  }

  /** Removes the block; the next draw starts below what was printed meanwhile. */
  clear(): void {
    if (this.#lines.length > 0) this.#output.raw(`${this.#up()}\u001b[J`)
    this.#lines = []
  }

  /** Back to the first line; a terminal made narrower since has broken the lines it shows. */
  #up(): string {
    const rows = this.#lines.reduce(
      (sum, line) => sum + Math.max(1, Math.ceil(line.length / this.#output.columns)),
      0,
    )
    return rows > 0 ? `\u001b[${rows}A\r` : ''
  }
}
