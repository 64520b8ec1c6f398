// Picture and replay from the frames of a plug-in, which may throw or be anything at all: then there is a sentence instead, and
// the search ends as well as without pictures.

import type { Frames } from '../../../shared/frames.js'
import { framesFault } from '../../../shared/pictures/index.js'
import { plainText } from '../../../shared/refusals.js'
import { bestSvg } from './best-svg.js'
import type { PictureFacts } from './facts.js'
import { replayHtml } from './replay.js'

export type Drawn = { readonly svg: string; readonly html: string } | { readonly fault: string }

/** `makeFrames` calls the plug-in; whatever it does wrong comes back as a fault, for a person. */
export function drawPictures(makeFrames: () => Frames, facts: PictureFacts): Drawn {
  const made = soundFrames(makeFrames)
  if (typeof made === 'string') return { fault: made }
  return { svg: bestSvg(made, facts), html: replayHtml(made, facts) }
}

function soundFrames(makeFrames: () => Frames): Frames | string {
  try {
    const frames = makeFrames()
    const fault = framesFault(frames)
    return fault === undefined ? frames : `The frames of the problem cannot be drawn: ${fault}.`
  } catch (error) {
    const text = plainText(error instanceof Error ? error.message : String(error)).slice(0, 200)
    return `The frames of the problem cannot be drawn: ${text}.`
  }
}
