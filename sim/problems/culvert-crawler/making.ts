// What the workshop can make of a crawler, what a genome asks for, and what the machine is used for. Workshop and
// culvert are invented; the cautions that leave with a machine follow from here (shared/making/hazards.ts).

import { actuatorClasses } from '../../../shared/making/actuators.js'
import { siliconeTubes } from '../../../shared/making/stock.js'
import type { Parts, Process, Use } from '../../../shared/making/types.js'
import { buildBody } from './body.js'
import type { CrawlerGenome } from './genome.js'
import type { Machine, Member } from './machine.js'
import { numbers } from './numbers.js'

/** The stiffness classes of the struts are rows of the workshop's stock. */
const tubes = { soft: siliconeTubes.a10, firm: siliconeTubes.a20, hard: siliconeTubes.a30 } as const

export const crawlerProcess: Process = {
  name: 'silicone tubes and bellows joined on the bench',
  methods: ['cutting-to-length', 'casting', 'gluing', 'screwing'],
  stock: Object.values(tubes),
  actuators: [actuatorClasses.bellows],
  // What still turns round in the culvert's portal, and what one person draws out by its line. Assumed.
  envelopeM: [0.7, 0.12],
  massMostKg: 1.5,
}

export function partsOf(genome: CrawlerGenome): Parts {
  return partsOfMachine(buildBody(genome))
}

/** Struts by their row of stock, actuators by their class; how much room the body takes along every axis. */
export function partsOfMachine(body: Machine): Parts {
  const sizeM = (axis: number) => {
    const places = body.positionsM.map((position) => position[axis]!)
    return Math.max(...places) - Math.min(...places)
  }
  return {
    struts: body.members
      .filter(({ group }) => group < 0)
      .map((member) => ({
        name: partName(member),
        stock: tubes[member.kind as 'soft'].name,
        lengthM: member.lengthM,
      })),
    actuators: body.members
      .filter(({ group }) => group >= 0)
      .map((member) => {
        const stroke = body.strains[member.group]!
        return {
          name: partName(member),
          class: actuatorClasses.bellows.name,
          lengthM: member.lengthM,
          stroke,
          ratePerSecond: 2 * Math.PI * body.frequencyHz * stroke,
        }
      }),
    envelopeM: body.positionsM[0]!.map((_, axis) => sizeM(axis)),
    massKg: body.massKg,
  }
}

function partName({ place, column }: Member): string {
  return `${place} of column ${column + 1}`
}

/** The largest energy in one strut at the largest stroke, J: what it lets go when it tears. */
function strutEnergyJ(body: Machine): number {
  return body.members.reduce((most, { stiffnessNpm, lengthM }) => {
    const stretchM = numbers.strainMost * lengthM
    return Math.max(most, (stiffnessNpm * stretchM * stretchM) / 2)
  }, 0)
}

export function useOf(genome: CrawlerGenome): Use {
  return useOfMachine(buildBody(genome), 5)
}

/**
 * What a crawler is used for, in its own numbers. Battery, voltage and hoses are assumed. `strutsPerBay`: as many close
 * one bay at most.
 */
export function useOfMachine(body: Machine, strutsPerBay: number): Use {
  const bellows = body.members.filter(({ group }) => group >= 0)
  const hasAir = bellows.length > 0
  // As much again in the hoses.
  const airM3 = 2 * bellows.reduce((sum, { lengthM }) => sum + lengthM * numbers.boreAreaM2, 0)
  return {
    places: ['culvert'],
    wetted: 'raw-water',
    energy: hasAir ? ['compressed-gas', 'battery'] : ['battery'],
    gasPressurePa: hasAir ? numbers.pressurePa : 0,
    gasVolumeM3: airM3,
    liquidPressurePa: 0,
    storedElasticJ: strutEnergyJ(body),
    suspendedKg: 0,
    suspendedHeightM: 0,
    movingParts: hasAir,
    peakForceN: Math.min(bellows.length, strutsPerBay) * numbers.pressurePa * numbers.boreAreaM2,
    rotationHz: 0,
    // Valves at the portal; the puck has a cell of its own.
    voltageV: 12,
    battery: 'lithium',
    hottestC: 40,
    massKg: body.massKg,
    onRunningMachine: false,
    vibrationHz: hasAir ? body.frequencyHz : 0,
    upstreamOfPump: true,
  }
}
