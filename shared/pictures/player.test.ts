// Watching a run: time, keys, the turntable; as values, without a page.

import { describe, expect, it } from 'vitest'
import { trussFrames } from '../../tests/frames-fixture.js'
import {
  atFrame,
  keys,
  keysFor,
  type Player,
  played,
  playing,
  pressed,
  startPlayer,
  turned,
} from './player.js'
import { sceneOf } from './scene.js'

const flat = sceneOf(trussFrames({ bays: 2, chains: 1, frames: 51 }))
const solid = sceneOf(trussFrames({ bays: 2, chains: 2, frames: 51 }))
const still = startPlayer(flat, true)
const moving = startPlayer(flat, false)
const press = (player: Player, key: string, hasShift = false) => pressed(player, flat, key, hasShift)!

describe('time', () => {
  it('starts by itself, but not where people asked for less motion or there is one frame', () => {
    expect([moving.isPlaying, still.isPlaying]).toEqual([true, false])
    const single = sceneOf(trussFrames({ bays: 2, chains: 1, frames: 1 }))
    expect(startPlayer(single, false).isPlaying).toBe(false)
    expect(playing(startPlayer(single, false), single, true).isPlaying).toBe(false)
  })
  it('shows a short run in slow motion at first', () => {
    const frames = trussFrames({ bays: 2, chains: 1, frames: 61 })
    const speedOf = (secondsPerFrame: number) =>
      startPlayer(sceneOf({ ...frames, secondsPerFrame }), true).speed
    expect([0.5, 0.04, 0.02, 0.005, 0.0005].map(speedOf)).toEqual([1, 1, 0.5, 0.1, 0.02])
  })
  it('goes at the chosen speed, between frames too', () => {
    expect(played(moving, flat, 0.1).at).toBeCloseTo(2.5, 12)
    expect(played({ ...moving, speed: 0.25 }, flat, 0.1).at).toBeCloseTo(0.625, 12)
    expect(played(still, flat, 0.1)).toBe(still)
  })
  it('does not leap after the page was hidden', () => {
    expect(played(moving, flat, 100).at).toBeCloseTo(6.25, 12)
  })
  it('rests a second at the end, then begins anew', () => {
    let player: Player = { ...moving, at: 49.9 }
    const seconds: number[] = []
    for (let i = 1; i <= 60; i++) {
      player = played(player, flat, 0.02)
      if (player.at === 50) seconds.push(i * 0.02)
    }
    expect(seconds.at(-1)! - seconds[0]!).toBeCloseTo(0.98, 6)
    expect(player.at).toBeLessThan(10)
  })
  it('begins anew when played from the end', () => {
    expect(playing({ ...still, at: 50 }, flat, true)).toMatchObject({ at: 0, isPlaying: true })
  })
  it('goes to whole frames of the run only, and stands there', () => {
    expect(atFrame(moving, flat, 7.4)).toMatchObject({ at: 7, isPlaying: false })
    expect(atFrame(moving, flat, -3).at).toBe(0)
    expect(atFrame(moving, flat, 1e9).at).toBe(50)
  })
})

describe('keys', () => {
  it('play, step by one and by ten, and go to the ends', () => {
    expect(press(still, ' ').isPlaying).toBe(true)
    expect(press(moving, ' ').isPlaying).toBe(false)
    expect(press(moving, 'ArrowRight')).toMatchObject({ at: 1, isPlaying: false })
    expect(press({ ...still, at: 3.5 }, 'ArrowRight').at).toBe(4)
    expect(press({ ...still, at: 3.5 }, 'ArrowLeft').at).toBe(3)
    expect(press({ ...still, at: 30 }, 'ArrowLeft', true).at).toBe(20)
    expect(press({ ...still, at: 30 }, 'Home').at).toBe(0)
    expect(press(still, 'End').at).toBe(50)
  })
  it('change speed within the offered ones, whatever the case of letters', () => {
    expect(press(still, '+').speed).toBe(2)
    expect(press(press(press(still, '+'), '+'), '+').speed).toBe(4)
    expect(press({ ...still, speed: 0.01 }, '-').speed).toBe(0.01)
    expect(press(still, 'F').follows).toBe(false)
    expect(press(still, 'p').showsWay).toBe(false)
  })
  it('turn the turntable only where there is one, and are documented only there', () => {
    expect(pressed(still, flat, 'a', false)).toBeUndefined()
    expect(pressed(still, flat, 'x', false)).toBeUndefined()
    const start = startPlayer(solid, true)
    expect(pressed(start, solid, 'd', false)!.camera.turnRad).toBeGreaterThan(start.camera.turnRad)
    expect(pressed(start, solid, '3', false)!.camera.tiltRad).toBeCloseTo(Math.PI / 2, 12)
    expect(keysFor(flat).length).toBeLessThan(keysFor(solid).length)
  })
  it('mean one thing each', () => {
    const all = keys.flatMap((row) => row.keys)
    expect(new Set(all).size).toBe(all.length)
  })
})

describe('the turntable', () => {
  it('turns all round and tips from the side to straight down', () => {
    let player = startPlayer(solid, true)
    for (let i = 0; i < 100; i++) player = turned(player, 0.3, 0.2)
    expect(Math.abs(player.camera.turnRad)).toBeLessThanOrEqual(Math.PI)
    expect(player.camera.tiltRad).toBeCloseTo(Math.PI / 2, 12)
    for (let i = 0; i < 100; i++) player = turned(player, 0, -0.2)
    expect(player.camera.tiltRad).toBe(0)
  })
})
