// Which kind of link looks how: passive struts by line weight, their stiffness class; actuators as sleeves, open or full,
// with plain or dashed edges and an ink of their group. Kinds that would look alike get different dashes.

import type { Frames } from '../frames.js'
import {
  type ActiveInk,
  activeInks,
  dashes,
  type Ink,
  softestWidthPx,
  stiffestWidthPx,
  unknownWidthPx,
} from './style.js'

export interface KindLook {
  readonly kind: string
  readonly isActive: boolean
  readonly ink: Ink
  /** Of actuators: the sleeve is full and its bars are paper, or the other way round. */
  readonly isFull: boolean
  /** Of actuators: the sleeve's edges are dashed. */
  readonly isNotched: boolean
  /** In units of the line's width; of actuators that of their curve over time. */
  readonly dash: readonly number[]
  /** Of passive struts, before a view makes all lines finer or bolder. */
  readonly widthPx: number
  /** Numbers of its links. */
  readonly links: readonly number[]
  /** Drives of its links, in the order of `links`; empty where it is passive. */
  readonly drives: readonly (Float64Array | undefined)[]
}

interface Kind {
  readonly kind: string
  readonly isActive: boolean
  readonly weight: number | undefined
  readonly links: number[]
}

/** Looks of all kinds: passive ones from soft to stiff (those without a class first), then driven ones by name. */
export function kindLooks(frames: Frames): KindLook[] {
  const driven = new Map(frames.drive.map(({ link, values }) => [link, values]))
  const kinds = kindsOf(frames, driven)
  const passive = kinds.filter(({ isActive }) => !isActive)
  const order = (kind: Kind) => kind.weight ?? -1
  passive.sort((a, b) => order(a) - order(b))
  const active = kinds.filter(({ isActive }) => isActive)
  active.sort((a, b) => byName(a.kind, b.kind))
  return [
    ...passiveLooks(passive),
    ...active.map((kind, place) => ({
      kind: kind.kind,
      isActive: true,
      ink: activeInk(place),
      isFull: place % 2 === 1,
      isNotched: place % 4 >= 2,
      dash: dashes[place % dashes.length]!,
      widthPx: stiffestWidthPx,
      links: kind.links,
      drives: kind.links.map((link) => driven.get(link)),
    })),
  ]
}

export function activeInk(place: number): ActiveInk {
  return activeInks[place % activeInks.length]!
}

/** In order of appearance. */
function kindsOf(frames: Frames, driven: ReadonlyMap<number, Float64Array>): Kind[] {
  const kinds = new Map<string, Kind>()
  for (const [number, { kind, weight }] of frames.links.entries()) {
    const isActive = driven.has(number)
    // A kind of which only some are driven counts as two: a legend must not call a plain strut an actuator.
    const key = `${isActive} ${kind}`
    const one = kinds.get(key) ?? { kind, isActive, weight, links: [] }
    one.links.push(number)
    kinds.set(key, one)
  }
  return [...kinds.values()]
}

function passiveLooks(passive: readonly Kind[]): KindLook[] {
  const alike = new Map<number, number>()
  return passive.map(({ kind, weight, links }) => {
    const widthPx =
      weight === undefined ? unknownWidthPx : softestWidthPx + weight * (stiffestWidthPx - softestWidthPx)
    // Weights less than half a pixel apart look alike.
    const step = Math.round(widthPx / 0.7)
    const place = alike.get(step) ?? 0
    alike.set(step, place + 1)
    return {
      kind,
      isActive: false,
      isFull: false,
      isNotched: false,
      ink: place >= dashes.length ? 'faint' : 'ink',
      dash: dashes[place % dashes.length]!,
      widthPx,
      links,
      drives: [],
    }
  })
}

/** 'actuator 2' before 'actuator 10': by letters, then by the number at the end. */
function byName(a: string, b: string): number {
  const parts = (name: string) => {
    const [, word, number] = /^(.*?)(\d*)$/s.exec(name)!
    return { word: word!, number: Number(number) }
  }
  const [one, other] = [parts(a), parts(b)]
  if (one.word !== other.word) return one.word < other.word ? -1 : 1
  return one.number - other.number
}
