// The legend: a drawn sample and words for everything that a drawing may show, made by the routines that draw it.

import { bodyLook } from './draw-bodies.js'
import { motorAt, slideAt } from './draw-furniture.js'
import { hatchOf } from './draw-ground.js'
import { contactOperation, linkOperations, nodeOperation, type Weights } from './draw-links.js'
import type { KindLook } from './looks.js'
import type { Operation } from './operations.js'
import type { Scene } from './scene.js'

export interface LegendRow {
  /** In a box of sampleWidthPx by sampleHeightPx. */
  readonly sample: readonly Operation[]
  readonly words: string
}

export const sampleWidthPx = 48
export const sampleHeightPx = 20
const middlePx = sampleHeightPx / 2
const weights: Weights = { unit: 1, lineFactor: 1, meanLinkPx: 40 }
const line = [3, middlePx, sampleWidthPx - 3, middlePx]

export function legendRows(scene: Scene): LegendRow[] {
  return tables.flatMap((rows) => rows(scene))
}

const tables: readonly ((scene: Scene) => LegendRow[])[] = [
  ({ kinds }) => kinds.filter(({ isActive }) => !isActive).map((look) => kindRow(look, look.kind, 0)),
  activeRows,
  contactRows,
  motorRows,
  bodyRows,
  wallRows,
  markerRows,
  shadowRows,
]

function kindRow(look: KindLook, words: string, drive: number): LegendRow {
  return { sample: linkOperations({ look, lines: [line], drives: [drive] }, weights), words }
}

/** Each group at rest, then once what its bars say. */
function activeRows({ kinds }: Scene): LegendRow[] {
  const active = kinds.filter(({ isActive }) => isActive)
  const first = active[0]
  if (first === undefined) return []
  return [
    ...active.map((look) => kindRow(look, look.kind, 0)),
    kindRow(first, 'driven longer', 1),
    kindRow(first, 'driven shorter', -1),
  ]
}

function contactRows({ frames }: Scene): LegendRow[] {
  if (frames.contacts === undefined) return []
  const disc = [sampleWidthPx / 2, 6, 4]
  return [{ sample: [...contactOperation(disc, weights), ...nodeOperation(disc, weights)], words: 'touches' }]
}

function motorRows({ frames }: Scene): LegendRow[] {
  return (frames.motors ?? []).map(({ label, slidesFrom }, place) => ({
    sample:
      slidesFrom === undefined
        ? motorAt(sampleWidthPx / 2, middlePx, 0.7, 7, place, 0.8)
        : slideAt(sampleWidthPx / 2 - 4, middlePx, [1, 0], 0.8, place, 0.8),
    words: label,
  }))
}

function bodyRows({ bodyLabels }: Scene): LegendRow[] {
  const roles = [...new Set(bodyLabels.map(({ role }) => role))]
  // Pieces that look alike share a row.
  return roles.map((kind) => {
    const label = bodyLabels.flatMap((one) => (one.role === kind ? [one.label] : [])).join(', ')
    const { role, edge, fill, dash } = bodyLook(kind)
    const lines = [[9, 4, 39, 4, 39, 16, 9, 16]]
    const dashPx = dash.length > 0 ? { dashPx: dash.map((one) => 1.8 * one) } : {}
    return {
      sample: [{ shape: 'lines', role, lines, isClosed: true, fill, stroke: edge, widthPx: 1.8, ...dashPx }],
      words: label,
    }
  })
}

function wallRows({ frames }: Scene): LegendRow[] {
  const rows = new Map((frames.walls ?? []).map((wall) => [wall.label, wall]))
  const box = { unit: 0.8, leftPx: 0, topPx: 0, widthPx: sampleWidthPx, heightPx: sampleHeightPx }
  return [...rows.values()].map(({ label, solid }) => ({
    sample: [
      ...(solid === undefined
        ? []
        : [
            {
              shape: 'lines',
              role: 'hatch',
              lines: hatchOf(line, 1, box),
              stroke: 'wall',
              widthPx: 1,
            } as const,
          ]),
      {
        shape: 'lines',
        role: 'wall',
        lines: [line],
        stroke: 'wall',
        widthPx: frames.dimensions === 3 ? 1.6 : 2.6,
      },
    ],
    words: label,
  }))
}

function markerRows({ frames }: Scene): LegendRow[] {
  const labels = [...new Set(frames.markers.map(({ label }) => label))]
  const [x, r] = [sampleWidthPx / 2, 6]
  const look = { stroke: 'marker', widthPx: 2 } as const
  const arms = [
    [1, 0],
    [-1, 0],
    [0, 1],
    [0, -1],
  ] as const
  const lines = arms.map(([dx, dy]) => [x + 5 * dx, middlePx + 5 * dy, x + 9 * dx, middlePx + 9 * dy])
  return labels.flatMap((label): LegendRow[] => [
    {
      sample: [
        { shape: 'discs', role: 'plate', discs: [x, middlePx, r], fill: 'marker', fillOpacity: 0.3 },
        { shape: 'discs', role: 'marker', discs: [x, middlePx, r], ...look },
        { shape: 'lines', role: 'marker', lines, ...look },
      ],
      words: label,
    },
    {
      sample: [{ shape: 'lines', role: 'way', lines: [line], stroke: 'way', widthPx: 1.4 }],
      words: `path of the ${label}`,
    },
  ])
}

function shadowRows({ frames, height }: Scene): LegendRow[] {
  if (frames.dimensions === 2 || height === undefined) return []
  return [
    {
      sample: [{ shape: 'lines', role: 'shadow', lines: [line], stroke: 'shadow', widthPx: 2.2 }],
      words: 'straight below, on the ground',
    },
  ]
}
