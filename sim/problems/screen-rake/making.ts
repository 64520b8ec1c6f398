// What the workshop can make of a rake, what a genome asks for, and what the machine is used for.

import { aluminiumSquareTubes, stainlessRods, stockRow } from '../../../shared/making/stock.js'
import type { Parts, Process, StrutPart, Use } from '../../../shared/making/types.js'
import type { RakeGenome } from './genome.js'
import { ratioOf } from './genome.js'
import { buildMachine, type Machine } from './machine.js'
import { driveOf, numbers } from './numbers.js'

const linkTube = stockRow(aluminiumSquareTubes, 'aluminium square tube 40 x 3 mm')
const tineRod = stockRow(stainlessRods, 'stainless rod 8 mm')

export const rakeProcess: Process = {
  name: 'tube and rod cut, drilled and pinned; motors bought',
  methods: ['cutting-to-length', 'machining', 'screwing'],
  stock: [linkTube, tineRod],
  actuators: [numbers.motor],
  massMostKg: 15,
}

/** Rough mass of what moves, kg: tubes, tines, cross bar and the motors that ride on links. */
export function machineKg({ outlines, bodies }: Machine): number {
  let massKg = 0
  for (const { label, from, to } of outlines) {
    const [dx, dy] = [to[0] - from[0], to[1] - from[1]]
    const kgpm = label === 'comb' ? numbers.tineKgpm * numbers.tineCount : numbers.linkKgpm
    massKg += label === 'cross bar' ? numbers.crossBarKg : kgpm * Math.sqrt(dx * dx + dy * dy)
  }
  for (const { extra } of bodies) if (extra && extra.massKg > 0.1) massKg += extra.massKg
  return massKg
}

const lengthOf = ({ from, to }: Machine['outlines'][number]) => {
  const [dx, dy] = [to[0] - from[0], to[1] - from[1]]
  return Math.sqrt(dx * dx + dy * dy)
}

/** Links of square tube; tines of rod, bent from one piece where they have a hook. The cross bar is the same for all. */
function strutsOf({ outlines }: Machine): StrutPart[] {
  const links = outlines.filter(({ label }) => label !== 'comb' && label !== 'cross bar')
  const tineM = outlines
    .filter(({ label }) => label === 'comb')
    .reduce((sum, piece) => sum + lengthOf(piece), 0)
  return [
    ...links.map((piece) => ({ name: piece.label, stock: linkTube.name, lengthM: lengthOf(piece) })),
    ...(tineM > 0 ? [{ name: 'tines', stock: tineRod.name, lengthM: tineM }] : []),
  ]
}

/** Motors by their class: what their stage leaves of the rate, and their torque before it. */
export function rakeParts(genome: RakeGenome): Parts {
  const machine = buildMachine(genome)
  return {
    struts: strutsOf(machine),
    actuators: machine.driven.map(({ joint }, i) => ({
      name: `${joint} motor`,
      class: numbers.motor.name,
      ratePerSecond: driveOf(ratioOf(genome, i)).rateMost * ratioOf(genome, i),
      force: numbers.motor.forceMost,
    })),
    massKg: machineKg(machine),
  }
}

/** Largest force (N) with which the comb or two links close, from the torque limits and the shortest lever of 0.1 m. */
export function closingForceN(genome: RakeGenome): number {
  const { driven } = buildMachine(genome)
  return driven.reduce((most, { effortPerMotorNm, joint }) => {
    const effort = numbers.motor.forceMost * effortPerMotorNm
    return Math.max(most, joint === 'slide' ? effort : effort / 0.1)
  }, 0)
}

export function rakeUse(genome: RakeGenome): Use {
  const machine = buildMachine(genome)
  return {
    places: ['intake', 'outdoors'],
    wetted: 'raw-water',
    energy: ['mains'],
    gasPressurePa: 0,
    gasVolumeM3: 0,
    liquidPressurePa: 0,
    storedElasticJ: 0,
    suspendedKg: machineKg(machine),
    suspendedHeightM: genome.baseY[0]!,
    movingParts: true,
    peakForceN: closingForceN(genome),
    rotationHz: 1 / genome.period[0]!,
    voltageV: numbers.motor.voltageV,
    battery: 'none',
    hottestC: numbers.motor.hottestC,
    massKg: machineKg(machine),
    onRunningMachine: false,
    vibrationHz: 0,
    upstreamOfPump: true,
  }
}
