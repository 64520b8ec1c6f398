// Looking at machines: the one renderer of stills and motion. Frames (shared/frames.ts) become a scene; a scene, a moment
// and a view become a display list; a painter puts it on SVG or canvas. Pure, without DOM; runs in Node and browsers.

export type { Box, Point } from './boxes.js'
export { type DrawOptions, drawMoment } from './draw.js'
export { axisOperations, scaleBarM, scaleBarOperations } from './draw-furniture.js'
export { drawStrip, stripFromPx, stripHeightPx } from './draw-strip.js'
export { framesFault } from './fault.js'
export { type LegendRow, legendRows, sampleHeightPx, sampleWidthPx } from './legend.js'
export { lengthText, momentsOf, roundStep, roundStepUp, secondsAt, timeText } from './measure.js'
export { type Moment, momentAt } from './moment.js'
export { drawLegend, drawMoments, momentTimes, type Sheet, type SheetPlace } from './moments.js'
export { type Operation, textWidthPx, type Words } from './operations.js'
export { type PackedFrames, packFrames, unpackFrames } from './packing.js'
export { type Pen, paintCanvas } from './paint-canvas.js'
export { darkStyle, escaped, svgDocument, svgElements } from './paint-svg.js'
export {
  atFrame,
  type Key,
  keysFor,
  type Player,
  played,
  playing,
  pressed,
  speeds,
  startPlayer,
  turned,
} from './player.js'
export { type Axes, axesOf, type Camera, extentsOf, sideCamera, startCamera } from './projection.js'
export { type Scene, sceneOf } from './scene.js'
export { drawStage, stageView } from './stage.js'
export { dark, fontFamily, type Ink, light, type Theme } from './style.js'
export { fitBox, followBox, type Rectangle, type View } from './view.js'
