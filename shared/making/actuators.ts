// Actuator classes of the workshop: what a real actuator of each kind can do at most. Their limits hold in the
// simulation unless a problem says otherwise, and makeability.ts refuses genomes that ask for more.
//
// Power. Where only the force at standstill and the speed without load are known, force is taken to fall along a
// straight line with speed (common practice, no source); the most power is then a quarter of their product.

import { check } from '../check.js'
import { cos } from '../detmath/index.js'
import { silicones } from './materials.js'
import type { ActuatorClass } from './types.js'

/** Most power (W, or W per metre of length) on a straight line from full force to full rate. */
export function straightLinePower(forceMost: number, rateMostPerSecond: number): number {
  return (forceMost * rateMostPerSecond) / 4
}

/**
 * Force (N) of an ideal braided muscle: (pi D0^2 p / 4) (3 cos^2 angle - 1), D0 the diameter at 90 degrees, angle
 * between braid and axis in radians. Chou and Hannaford, Measurement and modeling of McKibben pneumatic artificial
 * muscles, 1996, from memory. Zero at 54.7356 degrees.
 */
export function braidForceN(pressurePa: number, diameterAt90M: number, angleRadians: number): number {
  const cosine = cos(angleRadians)
  return ((Math.PI * diameterAt90M * diameterAt90M * pressurePa) / 4) * (3 * cosine * cosine - 1)
}

/** Largest contraction of an ideal braided muscle as a share of its length: 1 - 1 / (sqrt(3) cos angle). */
export function braidContractionMost(startAngleRadians: number): number {
  return 1 - 1 / (Math.sqrt(3) * cos(startAngleRadians))
}

/** Force (N) of a bellows or piston: gauge pressure times effective area. */
export function bellowsForceN(pressurePa: number, boreAreaM2: number): number {
  return pressurePa * boreAreaM2
}

/** Gauge pressure and effective area of the small bellows. */
export const smallBellows = { pressurePa: 50e3, boreAreaM2: Math.PI * 0.006 * 0.006 } as const
const bellowsForce = bellowsForceN(smallBellows.pressurePa, smallBellows.boreAreaM2)

/** Thin wire of shape-memory alloy. */
const memoryWire = { areaM2: (Math.PI * 0.00025 * 0.00025) / 4, stressMostPa: 172e6 } as const
const memoryWireForce = memoryWire.areaM2 * memoryWire.stressMostPa

export const actuatorClasses = {
  bellows: {
    name: 'bellows 12 mm, 50 kPa',
    kind: 'bellows',
    motion: 'linear',
    forceMost: bellowsForce,
    strokeMost: 0.25,
    rateMostPerSecond: 1.2,
    powerMost: straightLinePower(bellowsForce, 1.2),
    dutyMost: 1,
    pulls: true,
    pushes: true,
    lengthLeastM: 0.025,
    lengthMostM: 0.2,
    massKgpm: silicones.a10.densityKgpm3 * Math.PI * 0.016 * 0.001,
    fittingKg: 0.004,
    gasPressurePa: smallBellows.pressurePa,
    voltageV: 0,
    hottestC: 30,
    source:
      "stroke 25 % as of fluidic muscles (makers' data sheets); force is pressure times bore; pulling needs a vacuum or a second chamber; rate, lengths and fitting assumed",
  },
  fluidicMuscle: {
    name: 'fluidic muscle 10 mm, 600 kPa',
    kind: 'fluidic muscle',
    motion: 'linear',
    forceMost: 630,
    strokeMost: 0.125,
    rateMostPerSecond: 0.6,
    powerMost: straightLinePower(630, 0.6),
    dutyMost: 1,
    pulls: true,
    pushes: false,
    lengthLeastM: 0.04,
    lengthMostM: 9,
    massKgpm: 0.094,
    fittingKg: 0.058,
    gasPressurePa: 600e3,
    voltageV: 0,
    hottestC: 60,
    source:
      "makers' data sheets: contraction about 25 % of the length, 0 to 600 kPa (read); force, mass and lengths from memory; rate assumed",
  },
  memoryWire: {
    name: 'shape-memory wire 0.25 mm, 90 C grade',
    kind: 'shape-memory wire',
    motion: 'linear',
    forceMost: memoryWireForce,
    strokeMost: 0.02,
    rateMostPerSecond: 0.04,
    powerMost: straightLinePower(memoryWireForce, 0.04),
    dutyMost: 0.16,
    pulls: true,
    pushes: false,
    lengthLeastM: 0.05,
    lengthMostM: 2,
    massKgpm: 6450 * memoryWire.areaM2,
    fittingKg: 0.001,
    gasPressurePa: 0,
    voltageV: 12,
    hottestC: 90,
    source:
      "makers' sheets: 172 MPa at most, 6450 kg/m3, 70 and 90 C grades, up to 5 % many times (read); 4 % used, heating in 1 s and cooling in 5.4 s from memory",
  },
  smallGearedMotor: {
    name: 'geared motor 37 mm, 12 V',
    kind: 'geared motor',
    motion: 'rotary',
    forceMost: 2.1,
    rateMostPerSecond: 21,
    powerMost: straightLinePower(2.1, 21),
    dutyMost: 0.5,
    pulls: true,
    pushes: true,
    lengthLeastM: 0.06,
    lengthMostM: 0.08,
    massKgpm: 0,
    fittingKg: 0.21,
    gasPressurePa: 0,
    voltageV: 12,
    hottestC: 80,
    source:
      "makers' data sheets of brushed 37 mm motors geared 1:50, from memory; duty and temperature assumed",
  },
  wormGearedMotor: {
    name: 'worm-geared motor, 24 V',
    kind: 'geared motor',
    motion: 'rotary',
    forceMost: 30,
    rateMostPerSecond: 6.3,
    powerMost: straightLinePower(30, 6.3),
    dutyMost: 0.25,
    pulls: true,
    pushes: true,
    lengthLeastM: 0.15,
    lengthMostM: 0.25,
    massKgpm: 0,
    fittingKg: 1.5,
    gasPressurePa: 0,
    voltageV: 24,
    hottestC: 80,
    source: "makers' data sheets of wiper-type motors, from memory; duty and temperature assumed",
  },
} as const satisfies { readonly [name: string]: ActuatorClass }

/** Limits of one linear actuator of this class and length, in the names of a lattice's guided strut. */
export function strutLimits(row: ActuatorClass, lengthM: number) {
  check(row.motion === 'linear', 'a strut is a linear actuator')
  return {
    forceLimitN: row.forceMost,
    strainLimit: row.strokeMost ?? 1,
    strainRateLimitPerSecond: row.rateMostPerSecond,
    powerLimitW: row.powerMost * lengthM,
  }
}
