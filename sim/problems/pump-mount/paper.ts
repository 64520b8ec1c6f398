// What a person is told of a mount: part by part, with units; what it is made of and by; what its use brings with it,
// from which the cautions follow.

import type { Parts, Process, Use } from '../../../shared/making/types.js'
import { naturalModes } from '../../measure/modes.js'
import { buildMount, type Mount } from './body.js'
import type { MountGenome } from './genome.js'
import { numbers } from './numbers.js'
import { strutClasses } from './stock.js'
import { load, weakness } from './trial.js'

const mm = (metres: number) => `${(metres * 1000).toFixed(1)} mm`
const nominal = { sensor: 1, batch: 1, speed: 1, leanRad: 0 }

/** Lines for a person, part by part, with units. */
export function describeMount(genome: MountGenome): readonly string[] {
  const mount = buildMount(genome)
  const loaded = load(mount, nominal, 1)
  const lines = [
    `Sensor: ${numbers.sensorKg} kg on a foot plate over ${mount.top.length} joints.`,
    `Grid: cells of ${mm(genome.cellWidth[0]!)} by ${mm(genome.cellHeight[0]!)}, ${mm(numbers.depthM)} deep; ` +
      `${(mount.materialKg * 1000).toFixed(0)} g of struts and joints.`,
    `Rubber: ${mount.compound} compound (loss factor ${lossAt(mount, 10)} at 10 Hz, ${lossAt(mount, 50)} at 50 Hz).`,
  ]
  const weak = weakness(mount)
  if (weak) lines.push(`It ${weak.reason}.`)
  if (!('reason' in loaded)) {
    const slow = naturalModes(loaded.shaking.spec).modes.slice(0, 3)
    lines.push(`Static sag: ${mm(loaded.sagM)}.`)
    for (const { radps, dampingRatio } of slow) {
      lines.push(`Mode: ${(radps / 2 / Math.PI).toFixed(1)} Hz, damping ratio ${dampingRatio.toFixed(3)}.`)
    }
  }
  for (const { name, kind, lengthM, cutM, stiffnessNpm, massKg } of mount.members) {
    const cut = kind.kind === 'bow' ? `, ${mm(cutM)} of strip` : ''
    const stiffness = `${stiffnessNpm.toFixed(0)} N/m`
    lines.push(`${name}: ${kind.name}, ${mm(lengthM)}${cut}, ${stiffness}, ${(massKg * 1000).toFixed(1)} g.`)
  }
  return lines
}

/** Of a rubber strut: relaxation time times angular frequency. */
function lossAt({ damping }: Mount, hertz: number): string {
  const { relaxationSeconds } = strutClasses[0]!.row.material
  return (relaxationSeconds * damping * 2 * Math.PI * hertz).toFixed(2)
}

export const mountProcess: Process = {
  name: 'moulded rubber lattice with bows of strip',
  methods: ['moulding', 'cutting-to-length', 'screwing'],
  stock: strutClasses.map((one) => one.row),
  actuators: [],
  wallLeastM: 0.001,
  envelopeM: [0.15, 0.12, 0.05],
  massMostKg: 1,
}

export function partsOfMount(genome: MountGenome): Parts {
  const mount = buildMount(genome)
  const wide = Math.max(...mount.positionsM.map(([x]) => Math.abs(x)))
  return {
    struts: mount.members.map(({ name, kind, cutM }) => ({ name, stock: kind.row.name, lengthM: cutM })),
    envelopeM: [2 * wide, mount.positionsM[mount.top[0]!]![1], numbers.depthM],
    massKg: mount.materialKg,
  }
}

/** Bolted to a pump that runs: what can come loose, and into what. */
export function useOfMount(genome: MountGenome): Use {
  const loaded = load(buildMount(genome), nominal, 1)
  const sagM = 'reason' in loaded ? 0 : loaded.sagM
  return {
    places: ['pump-room'],
    wetted: 'rain',
    energy: ['shaken-support'],
    gasPressurePa: 0,
    gasVolumeM3: 0,
    liquidPressurePa: 0,
    // Half of weight times sag.
    storedElasticJ: 0.5 * numbers.sensorKg * numbers.gravityMps2 * sagM,
    suspendedKg: numbers.sensorKg,
    // A pump's bearing bracket above the floor. Assumed.
    suspendedHeightM: 1,
    movingParts: true,
    peakForceN: 5 * numbers.sensorKg * numbers.gravityMps2,
    rotationHz: numbers.fullHz,
    // The pump's motor; the sensor itself runs on 24 V.
    voltageV: 400,
    battery: 'none',
    hottestC: 60,
    onRunningMachine: true,
    vibrationHz: numbers.fullHz,
    upstreamOfPump: false,
  }
}
