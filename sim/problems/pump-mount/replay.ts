// The replay of one case. What moves are tenths of a millimetre: motion is drawn many times larger, from where things
// stand at rest, and slower than it is. The numbers say so in the picture.

import type { Frames } from '../../../shared/problem.js'
import { advance } from '../../lattice/advance.js'
import { buildLattice } from '../../lattice/build.js'
import type { Mount } from './body.js'
import { columns } from './genome.js'
import { type CaseName, numbers } from './numbers.js'
import { strutClasses } from './stock.js'
import { groupOf, load, type MountCondition, speedIn } from './trial.js'

const larger = 60
/** A frame for every so many samples of the record. */
const samplesPerFrame = 2
/** Of steady cases the last part, of changes of speed everything. */
const steadyFrames = 60

/** Frames of one case; of a mount that does not carry its sensor, the unloaded one. */
export function mountFrames(mount: Mount, condition: MountCondition, name: CaseName): Frames {
  const loaded = load(mount, condition, 1)
  const speed = speedIn(name, condition)
  const positions: Float64Array[] = []
  if ('reason' in loaded) positions.push(Float64Array.from(mount.positionsM.flat()))
  else {
    const { spec, stepSeconds, stepsPerSample, samples } = loaded.shaking
    const lattice = buildLattice({
      ...spec,
      groups: [groupOf(speed)],
      drive: { startSeconds: 0, rampSeconds: numbers.growSeconds },
      stepSeconds,
    })
    const rest = spec.nodes.flatMap((node) => node.positionM)
    const frames = Math.floor((samples - 1) / samplesPerFrame)
    for (let frame = 0; frame <= frames; frame++) {
      if (frame > 0 && advance(lattice, stepsPerSample * samplesPerFrame)) break
      if (speed.seconds === 0 && frame > 0 && frame < frames - steadyFrames) continue
      positions.push(
        Float64Array.from(rest, (place, i) => {
          const now = lattice.nodes[(i >> 1) * lattice.stride + (i & 1)]!
          return place + larger * (now - place)
        }),
      )
    }
  }
  return { ...drawn(mount), positions }
}

function drawn(mount: Mount): Omit<Frames, 'positions'> {
  const { members, top, sensorNode, positionsM } = mount
  const plate = top.map((joint) => ({ a: joint, b: sensorNode, kind: 'sensor body', weight: 1 }))
  return {
    dimensions: 2,
    secondsPerFrame: samplesPerFrame / numbers.samplesPerSecond,
    links: [
      ...members.map(({ a, b, kind }) => {
        return { a, b, kind: kind.name, weight: strutClasses.indexOf(kind) / (strutClasses.length - 1) }
      }),
      ...top.slice(1).map((joint, i) => ({ a: top[i]!, b: joint, kind: 'sensor body', weight: 1 })),
      ...plate,
    ],
    nodeRadiiM: positionsM.map((_, i) => (i < columns ? 0.002 : 0.0015)),
    ground: [],
    markers: [{ node: sensorNode, label: 'sensor', radiusM: 0.008 }],
    drive: [],
    note: `motion drawn ${larger} times larger`,
  }
}
