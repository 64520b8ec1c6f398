// How a run is watched, as values: where in time one is, whether it plays, how fast, from where one looks. Pages and the
// dashboard hold one and hand it through these functions; drawing it is draw.ts. No clock here: time comes in.

import { type Camera, sideCamera, startCamera, tiltMostRad } from './projection.js'
import type { Scene } from './scene.js'

export interface Player {
  /** In frames from the start; between two frames while it plays. */
  readonly at: number
  readonly isPlaying: boolean
  /** Times real time. */
  readonly speed: number
  readonly follows: boolean
  readonly showsWay: boolean
  readonly camera: Camera
  /** Seconds that it has rested at the end. */
  readonly restedSeconds: number
}

export const speeds: readonly number[] = [0.01, 0.02, 0.05, 0.1, 0.25, 0.5, 1, 2, 4]
/** Shorter runs start in slow motion, so that they take at least this long. */
const runSecondsLeast = 1.5
/** At the end it rests, then begins anew. */
export const restSeconds = 1
/** A page that was hidden does not leap when it is shown again. */
const stepSecondsMost = 0.25

/** Paused where the run has one frame or people asked for less motion. */
export function startPlayer(scene: Scene, wantsLessMotion: boolean): Player {
  return {
    at: 0,
    isPlaying: !wantsLessMotion && scene.lastFrame > 0,
    speed: startSpeed(scene),
    follows: true,
    showsWay: true,
    camera: scene.frames.dimensions === 3 ? startCamera : sideCamera,
    restedSeconds: 0,
  }
}

/** Real time, or the fastest slow motion in which a short run can be seen. */
function startSpeed({ lastFrame, frames }: Scene): number {
  const seconds = lastFrame * frames.secondsPerFrame
  const slow = speeds.filter((speed) => speed <= 1 && seconds >= runSecondsLeast * speed)
  return slow.at(-1) ?? (lastFrame === 0 ? 1 : speeds[0]!)
}

/** What time does to it. */
export function played(player: Player, scene: Scene, elapsedSeconds: number): Player {
  if (!player.isPlaying) return player
  const seconds = Math.min(stepSecondsMost, Math.max(0, elapsedSeconds))
  const { lastFrame, frames } = scene
  if (player.at >= lastFrame) {
    const restedSeconds = player.restedSeconds + seconds
    return restedSeconds >= restSeconds
      ? { ...player, at: 0, restedSeconds: 0 }
      : { ...player, restedSeconds }
  }
  return { ...player, at: Math.min(lastFrame, player.at + (seconds * player.speed) / frames.secondsPerFrame) }
}

/** To a frame, paused. */
export function atFrame(player: Player, scene: Scene, frame: number): Player {
  const at = Math.min(scene.lastFrame, Math.max(0, Math.round(frame)))
  return { ...player, at, isPlaying: false, restedSeconds: 0 }
}

export function playing(player: Player, scene: Scene, isPlaying: boolean): Player {
  if (!isPlaying || scene.lastFrame === 0) return { ...player, isPlaying: false }
  return { ...player, isPlaying, at: player.at >= scene.lastFrame ? 0 : player.at, restedSeconds: 0 }
}

/** Steps from the frame before, or after: forwards from between two frames is to the next. */
function stepped(player: Player, scene: Scene, by: number): Player {
  const from = by > 0 ? Math.floor(player.at + 1e-9) : Math.ceil(player.at - 1e-9)
  return atFrame(player, scene, from + by)
}

function faster(player: Player, by: 1 | -1): Player {
  const next =
    by > 0 ? speeds.find((speed) => speed > player.speed) : speeds.findLast((speed) => speed < player.speed)
  return { ...player, speed: next ?? player.speed }
}

/** The turntable by angles; it tips from the side to straight down, and turns all round. */
export function turned(player: Player, turnRad: number, tiltRad: number): Player {
  const whole = 2 * Math.PI
  const turn = player.camera.turnRad + turnRad
  return {
    ...player,
    camera: {
      turnRad: turn - whole * Math.round(turn / whole),
      tiltRad: Math.min(tiltMostRad, Math.max(0, player.camera.tiltRad + tiltRad)),
    },
  }
}

function looking(player: Player, camera: Camera): Player {
  return { ...player, camera }
}

export interface Key {
  /** As KeyboardEvent.key gives it; letters in lower case. */
  readonly keys: readonly string[]
  /** As printed on keyboards, for the page. */
  readonly shown: string
  readonly says: string
  /** Only where there is a turntable. */
  readonly isSolid?: boolean
  readonly act: (player: Player, scene: Scene, key: string, hasShift: boolean) => Player
}

const tenth = Math.PI / 18

/** Every key of a player; pages document from this table. */
export const keys: readonly Key[] = [
  {
    keys: [' '],
    shown: 'space',
    says: 'play, pause',
    act: (player, scene) => playing(player, scene, !player.isPlaying),
  },
  {
    keys: ['ArrowLeft', 'ArrowRight'],
    shown: '← →',
    says: 'a frame back, forward; with shift ten',
    act: (player, scene, key, hasShift) =>
      stepped(player, scene, (key === 'ArrowLeft' ? -1 : 1) * (hasShift ? 10 : 1)),
  },
  {
    keys: ['Home', 'End'],
    shown: 'home, end',
    says: 'first, last frame',
    act: (player, scene, key) => atFrame(player, scene, key === 'Home' ? 0 : scene.lastFrame),
  },
  {
    keys: ['-', '+', '='],
    shown: '− +',
    says: 'slower, faster',
    act: (player, _, key) => faster(player, key === '-' ? -1 : 1),
  },
  {
    keys: ['f'],
    shown: 'f',
    says: 'follow the machine or show the whole way',
    act: (player) => ({ ...player, follows: !player.follows }),
  },
  {
    keys: ['p'],
    shown: 'p',
    says: 'path shown or not',
    act: (player) => ({ ...player, showsWay: !player.showsWay }),
  },
  {
    keys: ['a', 'd'],
    shown: 'a d',
    says: 'turn left, right',
    isSolid: true,
    act: (player, _, key) => turned(player, key === 'a' ? -tenth : tenth, 0),
  },
  {
    keys: ['w', 's'],
    shown: 'w s',
    says: 'look more from above, more from the side',
    isSolid: true,
    act: (player, _, key) => turned(player, 0, key === 'w' ? tenth : -tenth),
  },
  {
    keys: ['1', '2', '3', '4'],
    shown: '1 2 3 4',
    says: 'from the side, from the front, from above, from the corner',
    isSolid: true,
    act: (player, _, key) => looking(player, standardCameras[Number(key) - 1]!),
  },
]

const standardCameras: readonly Camera[] = [
  sideCamera,
  { turnRad: -Math.PI / 2, tiltRad: 0 },
  { turnRad: 0, tiltRad: tiltMostRad },
  startCamera,
]

/** Keys that do something for this scene. */
export function keysFor({ frames }: Scene): readonly Key[] {
  return keys.filter(({ isSolid }) => isSolid !== true || frames.dimensions === 3)
}

/** What a key does; undefined where it is none of ours. */
export function pressed(player: Player, scene: Scene, key: string, hasShift: boolean): Player | undefined {
  const name = key.length === 1 ? key.toLowerCase() : key
  const row = keysFor(scene).find((one) => one.keys.includes(name))
  return row?.act(player, scene, name, hasShift)
}
