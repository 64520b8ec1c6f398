// What a problem may declare about making and using its machines, as plain data: the process (what the workshop
// can make, and of what), the parts that a genome describes, and the use (energy, place, what it touches).
// makeability.ts compares parts with the process; hazards.ts derives the cautions from the use.
//
// Whatever is not declared counts as unknown, never as harmless: its cautions are shown. SI units.

/** What a number rests on: title and year, with "from memory", "common practice, no source" or "assumed" where so. */
export type Source = string

// ---- What the workshop has: stock tables ---------------------------------------------------------------------

/** A material; `youngSpread` is the usual spread between batches and makers, as a share (0.3: +-30 %). */
export interface Material {
  readonly name: string
  readonly youngPa: number
  readonly youngSpread: number
  readonly poissonRatio: number
  readonly densityKgpm3: number
  /** Largest strain that it bears again and again. */
  readonly strainMost: number
  /** Largest stress that it bears again and again, Pa; absent where strain is what limits it. */
  readonly stressMostPa?: number
  /** c / k of a strut made of it (Kelvin-Voigt): tan delta = relaxationSeconds times angular frequency. */
  readonly relaxationSeconds: number
  readonly source: Source
}

export type StockForm = 'tube' | 'square-tube' | 'rod' | 'wire' | 'strip' | 'sheet' | 'moulded'

/** One row of a stock table: a size that can be bought or made, in one material. */
export interface StockRow {
  readonly name: string
  readonly form: StockForm
  readonly material: Material
  /** Outer diameter or side of tubes, diameter of rods and wires, width of strips; absent for sheets and moulded parts. */
  readonly widthM?: number
  /** Wall of tubes, thickness of strips and sheets, diameter of rods and wires: the least dimension. */
  readonly wallM: number
  /** Cross-section that carries, m^2; for sheets and moulded parts that of one metre of width. */
  readonly areaM2: number
  /** Shortest and longest piece that can be cut and joined. */
  readonly lengthLeastM: number
  readonly lengthMostM: number
  /** Largest error of `wallM` as delivered, m. */
  readonly wallToleranceM: number
  readonly source: Source
}

/** A kind of actuator that can be bought or made; all limits are of one actuator. */
export interface ActuatorClass {
  readonly name: string
  readonly kind: 'fluidic muscle' | 'bellows' | 'shape-memory wire' | 'geared motor'
  /** 'linear': force N, stroke in strain of the length. 'rotary': torque N m, stroke in radians. */
  readonly motion: 'linear' | 'rotary'
  /** Largest force (N) or torque (N m). */
  readonly forceMost: number
  /** Largest change of length from the middle as a share of the length, or radians; absent: turns for ever. */
  readonly strokeMost?: number
  /** Largest rate: strain per second, or radians per second without load. */
  readonly rateMostPerSecond: number
  /** Largest mechanical power. Linear: W per metre of length. Rotary: W. */
  readonly powerMost: number
  /** Largest share of time under load. */
  readonly dutyMost: number
  readonly pulls: boolean
  readonly pushes: boolean
  readonly lengthLeastM: number
  readonly lengthMostM: number
  readonly massKgpm: number
  readonly fittingKg: number
  /** What it brings into the machine's use. */
  readonly gasPressurePa: number
  readonly voltageV: number
  readonly hottestC: number
  readonly source: Source
}

export const makingMethods = [
  'cutting-to-length',
  'moulding',
  'casting',
  'gluing',
  'filament-printing',
  'resin-printing',
  'laser-cutting',
  'machining',
  'sheet-metal-cutting',
  'soldering',
  'screwing',
] as const
export type MakingMethod = (typeof makingMethods)[number]

/** What can be made, and of what. Everything that is absent is not limited. */
export interface Process {
  readonly name: string
  readonly methods: readonly MakingMethod[]
  /** Rows that parts may be cut from, by name. */
  readonly stock: readonly StockRow[]
  readonly actuators: readonly ActuatorClass[]
  /** Thinnest wall and narrowest gap that come out right. */
  readonly wallLeastM?: number
  readonly gapLeastM?: number
  /** Largest machine, sides in any order, m. */
  readonly envelopeM?: readonly number[]
  readonly massMostKg?: number
}

// ---- What a genome describes ---------------------------------------------------------------------------------

export interface StrutPart {
  /** For a person: 'upper chord 3'. */
  readonly name: string
  /** Name of a row of the process's stock. */
  readonly stock: string
  readonly lengthM: number
}
export interface ActuatorPart {
  readonly name: string
  /** Name of an actuator class of the process. */
  readonly class: string
  /** Of linear ones. */
  readonly lengthM?: number
  /** Largest change from the middle that is commanded: share of the length, or radians. */
  readonly stroke?: number
  readonly ratePerSecond?: number
  /** Force (N) or torque (N m) that is asked of it. */
  readonly force?: number
  /** W per metre of length, or W. */
  readonly power?: number
  readonly duty?: number
}
export interface Thickness {
  readonly name: string
  readonly thicknessM: number
}
/** The machine that a genome describes, as far as making it goes. */
export interface Parts {
  readonly struts?: readonly StrutPart[]
  readonly actuators?: readonly ActuatorPart[]
  readonly walls?: readonly Thickness[]
  readonly gaps?: readonly Thickness[]
  /** Sides of the box that holds it. */
  readonly envelopeM?: readonly number[]
  readonly massKg?: number
}

// ---- What it is used for -------------------------------------------------------------------------------------

export const places = [
  'bench',
  'dry-room',
  'wet-room',
  'outdoors',
  'culvert',
  'pipe',
  'tank',
  'pump-well',
  'pump-room',
  'intake',
  'sewer',
] as const
export type Place = (typeof places)[number]

export const wettings = ['nothing', 'rain', 'raw-water', 'drinking-water', 'waste-water'] as const
export const energySources = [
  'none',
  'hand',
  'gravity',
  'mains',
  'battery',
  'compressed-gas',
  'hydraulic',
  'flowing-water',
  'shaken-support',
] as const
export const batteryKinds = ['none', 'lithium', 'lead-acid', 'nickel', 'alkaline'] as const

/** Energy, place and touch. A number of 0, false, 'none', 'nothing' or an empty list says: there is none. */
export interface Use {
  readonly places?: readonly Place[]
  readonly wetted?: (typeof wettings)[number]
  readonly energy?: readonly (typeof energySources)[number][]
  /** Gauge pressure and volume of gas in the machine and its hoses. */
  readonly gasPressurePa?: number
  readonly gasVolumeM3?: number
  readonly liquidPressurePa?: number
  /** Elastic energy that is let go at once if a spring, strut or line breaks. */
  readonly storedElasticJ?: number
  /** What falls if a mount or line fails, and how far. */
  readonly suspendedKg?: number
  readonly suspendedHeightM?: number
  /** Whether parts move against each other, and the largest force with which they close. */
  readonly movingParts?: boolean
  readonly peakForceN?: number
  /** Fastest part that turns all the way round, turns per second. */
  readonly rotationHz?: number
  /** Highest voltage anywhere in or on the machine. */
  readonly voltageV?: number
  readonly battery?: (typeof batteryKinds)[number]
  /** Hottest surface, degrees Celsius. */
  readonly hottestC?: number
  readonly massKg?: number
  /** Whether it holds, or holds something to, a machine that runs. */
  readonly onRunningMachine?: boolean
  /** Highest frequency at which it is shaken or driven for long, Hz. */
  readonly vibrationHz?: number
  /** Whether what breaks off can be carried into a pump. */
  readonly upstreamOfPump?: boolean
}

/** A problem that has no machine, such as a test function, says so. */
export const noMachine = 'no-machine'
