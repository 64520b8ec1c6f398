// Shows progress as it comes: a live block on a terminal, a line now and then in a log, nothing with --json.

import type { Output } from './command.js'
import type { ProgressView } from './progress-view.js'
import { drawProgress, fitted, LiveBlock, logLine } from './terminal.js'

const logEverySeconds = 10
/** Lines left for what was printed above the block. */
const islandsMost = 24

export interface Watch {
  show(view: ProgressView): void
  /** Prints above the live block. */
  say(sentence: string): void
  /** Leaves the last block standing. */
  end(view?: ProgressView): void
}

export function watch(output: Output): Watch {
  if (output.json) return { show() {}, say: output.note, end() {} }
  return output.isTerminal ? liveWatch(output) : logWatch(output)
}

function liveWatch(output: Output): Watch {
  const block = new LiveBlock(output)
  const draw = (view: ProgressView) =>
    block.draw(
      drawProgress(view, {
        columns: output.columns - 1,
        unicode: output.unicode,
        islandsMost,
        clockAfter: timeOfDay,
      }),
    )
  let last: ProgressView | undefined
  return {
    show(view) {
      last = view
      draw(view)
    },
    say(sentence) {
      block.clear()
      for (const line of sentence.split('\n')) output.print(fitted(line, output.columns - 1))
      if (last) draw(last)
    },
    end(view) {
      if (view) draw(view)
    },
  }
}

function logWatch(output: Output): Watch {
  let lastSeconds = Number.NEGATIVE_INFINITY
  let lastState: ProgressView['state'] | undefined
  const line = (view: ProgressView) => output.print(logLine(view, new Date().toISOString().slice(0, 19)))
  return {
    show(view) {
      const seconds = performance.now() / 1000
      // A pause and its end are told at once.
      if (seconds - lastSeconds < logEverySeconds && view.state === lastState) return
      lastSeconds = seconds
      lastState = view.state
      line(view)
    },
    say: output.print,
    end(view) {
      if (view) line(view)
    },
  }
}

/** 18:40 today, or with the day when it is another one. */
export function timeOfDay(secondsFromNow: number): string {
  const now = new Date()
  const then = new Date(now.getTime() + secondsFromNow * 1000)
  if (Number.isNaN(then.getTime())) return 'an unknown time'
  const two = (part: number) => String(part).padStart(2, '0')
  const clock = `${two(then.getHours())}:${two(then.getMinutes())}`
  if (then.toDateString() === now.toDateString()) return clock
  return `${then.getFullYear()}-${two(then.getMonth() + 1)}-${two(then.getDate())} ${clock}`
}
