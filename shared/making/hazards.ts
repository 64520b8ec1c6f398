// The table of hazards: one row a hazard, with a condition on what a problem declares, a caution and what to
// consult. Add a row, and cautions.ts, `check` and every picture, replay and summary know it.
//
// The numbers in the conditions say where a caution begins, not where danger ends. Standards and laws named here
// are from memory and differ between countries: local codes decide.

import { pow } from '../detmath/index.js'
import {
  above,
  allOf,
  anyOf,
  type Condition,
  type Declared,
  hasOneOf,
  isOneOf,
  isTrue,
} from './conditions.js'
import { short } from './makeability.js'
import type { Source } from './types.js'

export interface HazardRow {
  readonly key: string
  readonly hazard: string
  readonly when: Condition
  /** Why it can hurt, whatever the numbers. */
  readonly why: string
  /** The machine's own numbers, where there are any. */
  readonly numbers?: (declared: Declared) => string | undefined
  readonly consult: string
  /** Of the number in the condition. */
  readonly source: Source
}

const practice = 'common practice, no source'

const confined = hasOneOf('places', ['culvert', 'pipe', 'tank', 'pump-well', 'sewer'])
const enclosedFlow = hasOneOf('places', ['culvert', 'pipe', 'intake', 'sewer'])
const wet = anyOf(
  hasOneOf('places', [
    'wet-room',
    'outdoors',
    'culvert',
    'pipe',
    'tank',
    'pump-well',
    'pump-room',
    'intake',
    'sewer',
  ]),
  isOneOf('wetted', ['rain', 'raw-water', 'drinking-water', 'waste-water']),
)

const atmospherePa = 101_325

/**
 * Energy (J) that gas lets go when its vessel bursts: isentropic expansion to the atmosphere, p V / (k - 1) times
 * (1 - (p0 / p)^((k - 1) / k)), p absolute, k = 1.4 for air. The formula of pressure tests in ASME PCC-2, Repair of
 * pressure equipment and piping, 2018, from memory.
 */
export function gasEnergyJ(gaugePressurePa: number, volumeM3: number): number {
  const pressurePa = gaugePressurePa + atmospherePa
  return 2.5 * pressurePa * volumeM3 * (1 - pow(atmospherePa / pressurePa, 0.4 / 1.4))
}

/** Rules for toys let rigid projectiles without a soft tip have no more (EN 71-1, from memory). */
export const eyeEnergyJ = 0.08
/** Above this gauge pressure Directive 2014/68/EU on pressure equipment begins (from memory). */
export const pressureDirectivePa = 50e3
/** Liquid above about 7 bar has driven through skin (occupational-medicine literature, from memory). */
export const injectionPa = 700e3
/** Largest force that may clamp a finger or hand, ISO/TS 15066, Collaborative robots, 2016, from memory. */
export const handForceN = 140
/** Extra-low voltage: 50 V AC or 120 V DC, IEC 60364-4-41, 2005, from memory; the lower is used. */
export const extraLowVoltageV = 50
/** In water: 12 V AC or 30 V DC, IEC 60364-7-702, 2010, from memory; the lower is used. */
export const inWaterVoltageV = 12
/** Any surface may be touched for hours up to this, ISO 13732-1, Hot surfaces, 2006, from memory. */
export const touchableC = 43
/** Reference mass for lifting by most people at work, ISO 11228-1, 2003, from memory. */
export const liftingKg = 15

const kilopascal = (pascals: number) => `${short(pascals / 1000)} kPa gauge`

function gasNumbers({ gasPressurePa: pressure, gasVolumeM3: volume }: Declared): string | undefined {
  if (pressure === undefined) return undefined
  const held =
    volume === undefined ? '' : `, ${short(gasEnergyJ(pressure, volume))} J in ${short(volume * 1000)} l`
  const law =
    pressure > pressureDirectivePa ? ', above the 50 kPa where pressure-equipment law begins in the EU' : ''
  return `gas works at up to ${kilopascal(pressure)}${held}${law}`
}

const energyRows: readonly HazardRow[] = [
  {
    key: 'compressed-gas',
    hazard: 'Compressed gas',
    when: above('gasPressurePa', 0),
    numbers: gasNumbers,
    why: 'a bellows, hose or fitting that lets go can strike or throw parts',
    consult:
      "local pressure-equipment rules, the makers' data sheets of vessels, hoses and valves; relief valve, tied hoses, eye protection; vent before touching",
    source: practice,
  },
  {
    key: 'liquid-pressure',
    hazard: 'Liquid under pressure',
    when: above('liquidPressurePa', 0),
    numbers: ({ liquidPressurePa: pressure }) =>
      pressure === undefined
        ? undefined
        : `liquid at up to ${kilopascal(pressure)}${pressure > injectionPa ? ', enough to be driven through skin' : ''}`,
    why: 'hoses whip, and joints that fail flood or spray',
    consult:
      "local pressure-equipment rules, the makers' data sheets, a licensed fitter; never feel for a leak by hand",
    source: practice,
  },
  {
    key: 'stored-spring-energy',
    hazard: 'Stored spring energy',
    when: above('storedElasticJ', eyeEnergyJ),
    numbers: ({ storedElasticJ: energy }) =>
      energy === undefined ? undefined : `springs and stretched parts hold up to ${short(energy)} J`,
    why: 'a spring, strip or line that breaks or slips throws its ends at eyes and hands',
    consult:
      "the spring maker's data sheet; eye protection, safe way to relax it before it is opened, a cover",
    source: 'EN 71-1, Safety of toys, 2014, from memory: 0.08 J for rigid projectiles',
  },
  {
    key: 'suspended-load',
    hazard: 'Suspended load',
    when: above('suspendedKg', 0),
    numbers: ({ suspendedKg: mass, suspendedHeightM: height }) => {
      if (mass === undefined) return undefined
      const fall =
        height === undefined ? '' : ` and can fall ${short(height)} m (${short(mass * 9.81 * height)} J)`
      return `${short(mass)} kg hangs on the machine${fall}`
    },
    why: 'what hangs falls when a mount, strut or line fails',
    consult:
      'local lifting rules and a licensed rigger; a second, slack line of known strength; nobody below',
    source: practice,
  },
  {
    key: 'pinching',
    hazard: 'Pinching and crushing',
    when: allOf(isTrue('movingParts'), above('peakForceN', 0)),
    numbers: ({ peakForceN: force }) =>
      force === undefined
        ? undefined
        : `parts close on each other with up to ${short(force)} N${force > handForceN ? `, more than the ${handForceN} N that a hand may be clamped with` : ''}`,
    why: 'fingers and sleeves get between parts that move',
    consult:
      'local machine-safety rules (ISO 12100, ISO 13854: gaps); guard, emergency stop in reach, lockout before touching',
    source: practice,
  },
  {
    key: 'rotating-parts',
    hazard: 'Rotating parts',
    when: above('rotationHz', 0),
    numbers: ({ rotationHz: turns }) =>
      turns === undefined ? undefined : `a part turns up to ${short(60 * turns)} times a minute`,
    why: 'turning parts wind up sleeves, gloves and hair and throw what comes loose',
    consult: 'local machine-safety rules; fixed guard, emergency stop, lockout before touching, no gloves',
    source: practice,
  },
  {
    key: 'unexpected-start',
    hazard: 'Unexpected start',
    when: hasOneOf('energy', [
      'mains',
      'battery',
      'compressed-gas',
      'hydraulic',
      'gravity',
      'flowing-water',
      'shaken-support',
    ]),
    numbers: ({ energy }) =>
      energy && energy.length > 0 ? `driven by ${energy.join(', ').replaceAll('-', ' ')}` : undefined,
    why: 'it can start, or go on, when nobody expects it, and energy stays in it after switching off',
    consult:
      'local lockout rules (ISO 14118); one switch that isolates and is locked, stored energy let out, then tried',
    source: practice,
  },
]

const electricRows: readonly HazardRow[] = [
  {
    key: 'electric-shock',
    hazard: 'Electric shock',
    when: above('voltageV', extraLowVoltageV),
    numbers: ({ voltageV: voltage }) => (voltage === undefined ? undefined : `up to ${short(voltage)} V`),
    why: 'touching live parts can kill',
    consult:
      'local electrical codes and a licensed electrician; residual-current device, covers, isolation before opening',
    source: 'IEC 60364-4-41, Protection against electric shock, 2005, from memory: 50 V AC, 120 V DC',
  },
  {
    key: 'electricity-in-wet-places',
    hazard: 'Electricity in a wet place',
    when: allOf(above('voltageV', 0), wet),
    numbers: ({ voltageV: voltage }) =>
      voltage === undefined
        ? undefined
        : `up to ${short(voltage)} V${voltage > inWaterVoltageV ? `, more than the ${inWaterVoltageV} V AC (30 V DC) of installations in water` : ''}`,
    why: 'water gets into housings and carries current to people and steel',
    consult:
      "local electrical codes, a licensed electrician, the makers' data sheets; extra-low voltage from a safety transformer or battery, sealed housings",
    source: 'IEC 60364-7-702, Swimming pools and fountains, 2010, from memory: 12 V AC, 30 V DC in water',
  },
  {
    key: 'lithium-cells',
    hazard: 'Lithium cells',
    when: isOneOf('battery', ['lithium']),
    why: 'crushed, pierced, flooded, overcharged or hot cells burn with poisonous smoke and cannot be put out easily',
    consult:
      "the cell maker's data sheet, local fire and transport rules (UN 38.3); protected cells, hard dry housing, charged in sight on stone",
    source: practice,
  },
  {
    key: 'gassing-batteries',
    hazard: 'Other batteries',
    when: isOneOf('battery', ['lead-acid', 'nickel', 'alkaline']),
    why: 'charging cells give off hydrogen, leaking ones acid or lye, and short circuits burn',
    consult: "the maker's data sheet; fuse at the battery, air while charging, eye protection",
    source: practice,
  },
  {
    key: 'burnable-gas',
    hazard: 'Sparks in burnable gas',
    when: allOf(above('voltageV', 0), confined),
    why: 'pipes, wells and sewers can hold burnable gas, and switches, motors and broken leads spark',
    consult:
      'local rules for explosive atmospheres (in the EU Directive 1999/92/EC) and the operator; measure the gas before and during work',
    source: practice,
  },
  {
    key: 'hot-actuators',
    hazard: 'Hot surfaces',
    when: above('hottestC', touchableC),
    numbers: ({ hottestC: hot }) =>
      hot === undefined ? undefined : `surfaces reach up to ${short(hot)} degrees C`,
    why: 'heated wires, coils and motors burn skin and soften or light what holds them',
    consult:
      "the maker's data sheet, ISO 13732-1; cover, current limit that cannot stick on, heat-proof holders",
    source:
      'ISO 13732-1, Ergonomics of the thermal environment: hot surfaces, 2006, from memory: 43 C for hours',
  },
]

const placeRows: readonly HazardRow[] = [
  {
    key: 'drinking-water',
    hazard: 'Drinking water',
    when: isOneOf('wetted', ['raw-water', 'drinking-water']),
    why: 'rubbers, coatings, metals and lubricants give off into the water that people drink, and grow germs',
    consult:
      "local rules for materials in contact with drinking water, the makers' approvals for exactly this material, the water works' hygiene rules; disinfect before use",
    source: practice,
  },
  {
    key: 'foul-water',
    hazard: 'Foul water',
    when: anyOf(isOneOf('wetted', ['waste-water']), hasOneOf('places', ['sewer'])),
    why: 'what comes back from it carries germs',
    consult:
      'local occupational-health rules; gloves, washing, vaccination, and never back into drinking water',
    source: practice,
  },
  {
    key: 'bad-air',
    hazard: 'Bad air in confined spaces',
    when: confined,
    why: 'pipes, tanks and wells can hold too little oxygen or poisonous gas that cannot be seen or smelled',
    consult:
      'local confined-space rules, an entry permit and a trained watch outside (for example 29 CFR 1910.146); place and fetch the machine from outside',
    source: practice,
  },
  {
    key: 'flooding',
    hazard: 'Flooding',
    when: hasOneOf('places', ['culvert', 'pipe', 'tank', 'pump-well', 'intake', 'sewer']),
    why: 'water can come suddenly, from rain, a valve or a pump that starts, and a machine in the way makes it rise',
    consult: 'the operator: valves and pumps locked and tagged, weather watched, a way out kept free',
    source: practice,
  },
  {
    key: 'blocked-pipe',
    hazard: 'Stuck machine blocking the flow',
    when: enclosedFlow,
    numbers: ({ massKg: mass }) => (mass === undefined ? undefined : `${short(mass)} kg can stay behind`),
    why: 'a machine that stops, tears or floats off dams a pipe or screen and is hard to reach',
    consult:
      'the operator; a tether of known strength that is tried before, a written plan of how to get it back, and who decides to flush it',
    source: practice,
  },
  {
    key: 'parts-into-pump',
    hazard: 'Parts entering a pump',
    when: isTrue('upstreamOfPump'),
    why: 'a strut, screw or puck that comes off is carried into the pump, jams or breaks it and throws pieces',
    consult:
      "the operator and the pump maker's data sheet; pump isolated or screened, parts counted before and after",
    source: practice,
  },
  {
    key: 'mount-on-running-machine',
    hazard: 'Mount failing on a running machine',
    when: isTrue('onRunningMachine'),
    numbers: ({ suspendedKg: mass }) =>
      mass === undefined ? undefined : `the mount holds ${short(mass)} kg`,
    why: 'a mount that tears, melts or shakes loose drops its load onto shafts, belts and people and can hide a fault of the pump',
    consult:
      "the pump maker's data sheet and a licensed fitter; a catch that holds when the mount does not, fitted and inspected with the machine locked out",
    source: practice,
  },
  {
    key: 'beside-water',
    hazard: 'Falling into water',
    when: hasOneOf('places', ['tank', 'pump-well', 'intake']),
    why: 'whoever places or frees it works above deep or flowing water',
    consult: 'local rules for work beside water; railing or harness, life vest, never alone',
    source: practice,
  },
  {
    key: 'lifting',
    hazard: 'Lifting by hand',
    when: above('massKg', liftingKg),
    numbers: ({ massKg: mass }) => (mass === undefined ? undefined : `the machine is ${short(mass)} kg`),
    why: 'backs are hurt by lifting, and toes by what slips',
    consult: 'local manual-handling rules (ISO 11228-1); lifting gear or a second person, safety shoes',
    source: 'ISO 11228-1, Ergonomics: manual handling, 2003, from memory: 15 kg for most people',
  },
  {
    key: 'fatigue',
    hazard: 'Fatigue',
    when: above('vibrationHz', 0),
    numbers: ({ vibrationHz: frequency }) =>
      frequency === undefined
        ? undefined
        : `at ${short(frequency)} Hz a week is ${short((frequency * 604_800) / 1e6)} million cycles`,
    why: 'the simulation does not count cycles, and parts that are shaken for long crack without warning',
    consult:
      "the fatigue data of the material's maker; inspection at set hours, replacement before they are due",
    source: practice,
  },
]

const makingRows: readonly HazardRow[] = [
  {
    key: 'uncured-resins',
    hazard: 'Uncured resins',
    when: hasOneOf('methods', ['casting', 'moulding', 'gluing', 'resin-printing']),
    why: 'uncured resins, silicones and glues irritate and sensitise skin and lungs for good, and may stay uncured inside',
    consult: "the maker's safety data sheet; gloves that resist it, air, full cure, waste as the sheet says",
    source: practice,
  },
  {
    key: 'printing-fumes',
    hazard: 'Printing and cutting fumes',
    when: hasOneOf('methods', ['filament-printing', 'resin-printing', 'laser-cutting', 'soldering']),
    why: 'heated plastics, resins and fluxes give off fine particles and vapours; some plastics give off chlorine or cyanide under a laser',
    consult:
      "the makers' safety data sheets and local occupational-health rules; extraction, and known material only",
    source: practice,
  },
  {
    key: 'sharp-edges',
    hazard: 'Sharp edges and chips',
    when: hasOneOf('methods', ['machining', 'sheet-metal-cutting']),
    why: 'cut strip, wire ends and chips cut hands and eyes',
    consult: 'local workshop rules; eye protection, edges broken, offcuts held',
    source: practice,
  },
]

/** Every hazard that is known here. */
export const hazards: readonly HazardRow[] = [...energyRows, ...electricRows, ...placeRows, ...makingRows]
