// Materials of the workshop, supplier-neutral, each with its spread between batches and makers, and how hardness
// becomes stiffness. Ordinary numbers of the trade, good for comparing designs; measure your own batch before
// building. The workshop is invented.

import { exp } from '../detmath/index.js'
import type { Material } from './types.js'

/**
 * Young's modulus (Pa) at small strain of a rubber of Shore A hardness 0 to 99, after A. N. Gent, On the relation
 * between indentation hardness and Young's modulus, 1958: E[MPa] = 0.0981 (56 + 7.62336 S) / (0.137505 (254 -
 * 2.54 S)). Not valid on the Shore 00 scale.
 */
export function gentYoungPa(shoreA: number): number {
  return (1e6 * 0.0981 * (56 + 7.62336 * shoreA)) / (0.137505 * (254 - 2.54 * shoreA))
}

/** The same by another published line, log10 E[MPa] = 0.0235 S - 0.6403 (Ruess, in a maker's white paper). */
export function ruessYoungPa(shoreA: number): number {
  return 1e6 * exp(Math.LN10 * (0.0235 * shoreA - 0.6403))
}

/** What Gent's formula misses between compounds: +-30 % (trade literature). */
export const hardnessSpread = 0.3

const gent = 'Gent, On the relation between indentation hardness and Young’s modulus, 1958'

function silicone(shoreA: number, youngPa: number): Material {
  return {
    name: `silicone rubber, Shore A ${shoreA}`,
    youngPa,
    youngSpread: hardnessSpread,
    // Nearly incompressible: 0.49 to 0.5.
    poissonRatio: 0.49,
    // 1030 to 1080 by makers' data sheets, from memory.
    densityKgpm3: 1070,
    // Elongation at break is 364 to 1000 % by makers' data sheets, from memory; for many cycles assumed.
    strainMost: 0.5,
    // tan delta about 0.05 to 0.2 at low frequency (from memory): 0.06 to 0.19 between 10 and 30 Hz.
    relaxationSeconds: 1e-3,
    source: `${gent}; density and damping from memory; strain for many cycles assumed`,
  }
}

/**
 * Silicone rubber by Shore A hardness. The moduli are Gent's to six digits, written out: a stiffness that a search
 * was run with must not move in its last bit.
 */
export const silicones = {
  a10: silicone(10, 0.412683e6),
  a20: silicone(20, 0.731922e6),
  a30: silicone(30, 1.142372e6),
  a40: silicone(40, 1.689639e6),
  a50: silicone(50, 2.455812e6),
  a60: silicone(60, 3.605073e6),
  a70: silicone(70, 5.520507e6),
} as const satisfies { readonly [shoreA: string]: Material }

/** Moduli of foams are secants: the stress at 25 % compression over 0.25. */
export const foams = {
  closedCellPolyethylene: {
    name: 'closed-cell polyethylene foam, 33 kg/m3',
    youngPa: 40e3 / 0.25,
    youngSpread: 0.2,
    poissonRatio: 0.1,
    densityKgpm3: 33,
    strainMost: 0.25,
    relaxationSeconds: 2e-3,
    source:
      "a maker's data sheet (40 kPa at 25 %, 75 kPa at 40 %, 115 kPa at 50 %); spread, Poisson's ratio and damping assumed",
  },
  spongeRubber: {
    name: 'natural sponge rubber, 259 to 397 kg/m3',
    youngPa: 24e3 / 0.25,
    youngSpread: 0.43,
    poissonRatio: 0.1,
    densityKgpm3: 328,
    strainMost: 0.25,
    relaxationSeconds: 2e-3,
    source:
      "makers' data sheets (13.7 to 34.4 kPa at 25 %, the middle is used); Poisson's ratio and damping assumed",
  },
} as const satisfies { readonly [name: string]: Material }

/** Steel and aluminium structures lose at most 0.01 (from memory): 0.006 at 100 Hz. */
const metalRelaxationSeconds = 1e-5

export const metals = {
  springSteel: {
    name: 'hardened spring steel',
    youngPa: 206e9,
    youngSpread: 0.02,
    poissonRatio: 0.3,
    densityKgpm3: 7850,
    strainMost: 500e6 / 206e9,
    stressMostPa: 500e6,
    relaxationSeconds: metalRelaxationSeconds,
    source:
      'EN 10270-1, Steel wire for mechanical springs, 2011, from memory; stress for many cycles assumed',
  },
  stainlessSpringSteel: {
    name: 'stainless spring steel 1.4310',
    youngPa: 185e9,
    youngSpread: 0.03,
    poissonRatio: 0.3,
    densityKgpm3: 7900,
    strainMost: 400e6 / 185e9,
    stressMostPa: 400e6,
    relaxationSeconds: metalRelaxationSeconds,
    source:
      'EN 10270-3, Stainless spring steel wire, 2011, from memory; stress for many cycles assumed, less in water',
  },
  stainlessSteel: {
    name: 'stainless steel 1.4301',
    youngPa: 200e9,
    youngSpread: 0.03,
    poissonRatio: 0.3,
    densityKgpm3: 7900,
    strainMost: 150e6 / 200e9,
    stressMostPa: 150e6,
    relaxationSeconds: metalRelaxationSeconds,
    source: 'EN 10088, Stainless steels, 2005, from memory; stress for many cycles assumed',
  },
  aluminium: {
    name: 'aluminium 6060 T66',
    youngPa: 69e9,
    youngSpread: 0.02,
    poissonRatio: 0.33,
    densityKgpm3: 2700,
    strainMost: 50e6 / 69e9,
    stressMostPa: 50e6,
    relaxationSeconds: metalRelaxationSeconds,
    source: 'EN 755-2, Aluminium extruded profiles, 2016, from memory; stress for many cycles assumed',
  },
} as const satisfies { readonly [name: string]: Material }

export const plastics = {
  printedPla: {
    name: 'printed PLA, along the layers',
    youngPa: 3e9,
    youngSpread: 0.2,
    poissonRatio: 0.35,
    densityKgpm3: 1240,
    strainMost: 0.005,
    stressMostPa: 15e6,
    relaxationSeconds: 3e-5,
    source: "makers' data sheets, from memory; stress and strain for many cycles assumed",
  },
  printedTpu: {
    name: 'printed polyurethane, Shore A 95, along the layers',
    youngPa: 26e6,
    youngSpread: 0.3,
    poissonRatio: 0.45,
    densityKgpm3: 1210,
    strainMost: 0.2,
    relaxationSeconds: 5e-4,
    source: "makers' data sheets, from memory; strain for many cycles assumed",
  },
} as const satisfies { readonly [name: string]: Material }
