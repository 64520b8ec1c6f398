// What a player's stage shows now, for a canvas of a given size: the same for replay pages and the dashboard.

import type { Box } from './boxes.js'
import { type DrawOptions, drawMoment } from './draw.js'
import { momentAt } from './moment.js'
import type { Operation } from './operations.js'
import type { Player } from './player.js'
import type { Scene } from './scene.js'
import { fitBox, followBox, type Insets, type Rectangle, type View } from './view.js'

/** Room for scale bar and time above, the axis below. */
export function stageInsets(unit: number): Insets {
  return { leftPx: 14 * unit, rightPx: 14 * unit, topPx: 34 * unit, bottomPx: 36 * unit }
}

export function stageView(scene: Scene, player: Player, rectangle: Rectangle, unit: number): View {
  const box: Box = player.follows ? followBox(scene, player.at) : scene.wayBox
  return fitBox(box, scene, player.camera, rectangle, stageInsets(unit), unit)
}

export function drawStage(scene: Scene, player: Player, rectangle: Rectangle, unit: number): Operation[] {
  const options: DrawOptions = { showsWay: player.showsWay, hasAxis: true, hasScaleBar: true, hasTime: true }
  return drawMoment(
    scene,
    momentAt(scene.frames, player.at),
    stageView(scene, player, rectangle, unit),
    options,
  )
}
