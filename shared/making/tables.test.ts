// Promises of the stock tables. Bounds named here come from outside the tables they check.

import { describe, expect, test } from 'vitest'
import {
  actuatorClasses,
  bellowsForceN,
  braidContractionMost,
  braidForceN,
  smallBellows,
  strutLimits,
} from './actuators.js'
import { frictionRows, rubberFriction } from './friction.js'
import { foams, gentYoungPa, hardnessSpread, metals, plastics, ruessYoungPa, silicones } from './materials.js'
import {
  aluminiumSquareTubes,
  axialStiffnessNpm,
  mouldedWalls,
  siliconeTubes,
  springStrips,
  springWires,
  stainlessRods,
  stainlessTubes,
  stockRow,
} from './stock.js'
import type { ActuatorClass, Material, StockRow } from './types.js'

const radians = (degrees: number) => (degrees * Math.PI) / 180
const materials: readonly Material[] = [silicones, foams, metals, plastics].flatMap((table) =>
  Object.values<Material>(table),
)
const stock: readonly StockRow[] = [
  ...Object.values(siliconeTubes),
  ...springStrips,
  ...springWires,
  ...stainlessTubes,
  ...aluminiumSquareTubes,
  ...stainlessRods,
  ...mouldedWalls,
]
const actuators: readonly ActuatorClass[] = Object.values(actuatorClasses)

describe('hardness and modulus', () => {
  // Gent, On the relation between indentation hardness and Young's modulus, 1958: the formula was read in two
  // public sources, the values recomputed independently (MPa).
  test.each([
    [0, 0.157291],
    [5, 0.278266],
    [10, 0.412683],
    [15, 0.562913],
    [20, 0.731922],
    [25, 0.923465],
    [30, 1.142372],
    [40, 1.689639],
    [50, 2.455812],
    [60, 3.605073],
    [70, 5.520507],
  ])('Gent gives Shore A %d its published modulus', (shoreA, megapascal) => {
    expect(Math.abs(gentYoungPa(shoreA) / 1e6 - megapascal)).toBeLessThanOrEqual(0.5e-6 * 1.0001)
  })

  // Ruess, as given in a maker's white paper (read): log10 E[MPa] = 0.0235 S - 0.6403.
  test.each([
    [10, 0.393278],
    [20, 0.675616],
    [30, 1.160647],
    [40, 1.993885],
    [50, 3.425311],
  ])('Ruess gives Shore A %d its published modulus', (shoreA, megapascal) => {
    expect(Math.abs(ruessYoungPa(shoreA) / 1e6 - megapascal)).toBeLessThanOrEqual(0.5e-6 * 1.0001)
  })

  test('silicones stand in the table with Gent to six digits', () => {
    for (const [name, { youngPa }] of Object.entries(silicones)) {
      expect(Math.abs(youngPa - gentYoungPa(Number(name.slice(1))))).toBeLessThan(0.51)
    }
  })

  test('the two formulas agree within the spread between compounds up to Shore A 40', () => {
    for (const shoreA of [10, 20, 30, 40]) {
      expect(Math.abs(ruessYoungPa(shoreA) / gentYoungPa(shoreA) - 1)).toBeLessThan(hardnessSpread)
    }
  })
})

describe('materials', () => {
  test.each(materials.map((row) => [row.name, row] as const))('%s is physically possible', (_, row) => {
    expect(row.youngPa).toBeGreaterThan(0)
    expect(row.youngSpread).toBeGreaterThan(0)
    expect(row.youngSpread).toBeLessThan(0.5)
    // Isotropic solids: -1 < nu < 1/2.
    expect(row.poissonRatio).toBeGreaterThan(-1)
    expect(row.poissonRatio).toBeLessThan(0.5)
    // The stress that it is said to bear is no more than its stiffness makes of its strain (metals, plastics).
    if (row.stressMostPa !== undefined) {
      expect(row.stressMostPa).toBeLessThanOrEqual(row.youngPa * row.strainMost * (1 + 1e-9))
    }
  })

  test('silicones of Shore A 10 to 30 lie in the working range of makers, and damp as soft rubber does', () => {
    // Working range 0.05 to about 1.2 MPa, density 1030 to 1080 (makers' data sheets, from memory).
    for (const { youngPa, densityKgpm3, relaxationSeconds } of [
      silicones.a10,
      silicones.a20,
      silicones.a30,
    ]) {
      expect(youngPa).toBeGreaterThan(0.05e6)
      expect(youngPa).toBeLessThan(1.2e6)
      expect(densityKgpm3).toBeGreaterThanOrEqual(1030)
      expect(densityKgpm3).toBeLessThanOrEqual(1080)
      // tan delta 0.05 to 0.2 at 10 to 30 Hz (from memory).
      for (const hertz of [10, 30]) {
        const lossTangent = relaxationSeconds * 2 * Math.PI * hertz
        expect(lossTangent).toBeGreaterThan(0.05)
        expect(lossTangent).toBeLessThan(0.2)
      }
    }
  })

  test('a soft bar of 0.1 MPa and 1070 kg/m3 carries sound at 9.7 m/s: 48 Hz over 0.1 m', () => {
    // Recomputed; free-free bar, first mode c / 2 L. Holds the density of the table against the published sanity value.
    const speedMps = Math.sqrt(0.1e6 / silicones.a10.densityKgpm3)
    expect(speedMps).toBeCloseTo(9.7, 1)
    expect(speedMps / 0.2).toBeCloseTo(48, 0)
  })

  test('metals lose at most 0.01 up to 100 Hz', () => {
    // Steel and aluminium structures, from memory.
    for (const { relaxationSeconds } of Object.values<Material>(metals)) {
      expect(relaxationSeconds * 2 * Math.PI * 100).toBeLessThanOrEqual(0.01)
    }
  })

  test('foam bears its data sheet stress at 25 %', () => {
    expect(foams.closedCellPolyethylene.youngPa * 0.25).toBe(40e3)
    const { youngPa, youngSpread } = foams.spongeRubber
    expect(0.25 * youngPa * (1 - youngSpread)).toBeLessThanOrEqual(13.7e3 * 1.01)
    expect(0.25 * youngPa * (1 + youngSpread)).toBeGreaterThanOrEqual(34.3e3 * 0.99)
  })
})

describe('stock', () => {
  test('every row has a name of its own', () => {
    expect(new Set(stock.map(({ name }) => name)).size).toBe(stock.length)
    expect(stock.length).toBeGreaterThan(30)
  })

  test.each(stock.map((row) => [row.name, row] as const))('%s can exist', (_, row) => {
    expect(row.lengthLeastM).toBeLessThan(row.lengthMostM)
    expect(row.wallToleranceM).toBeGreaterThan(0)
    expect(row.wallToleranceM).toBeLessThan(row.wallM)
    // No more carries than the outline holds.
    const widthM = row.widthM!
    const outline =
      row.form === 'tube'
        ? (Math.PI * widthM * widthM) / 4
        : widthM * Math.max(row.wallM, row.form === 'square-tube' ? widthM : 0)
    expect(row.areaM2).toBeLessThanOrEqual(outline * (1 + 1e-12))
    if (row.form === 'tube') {
      const insideM = widthM - 2 * row.wallM
      expect(insideM).toBeGreaterThan(0)
      const ring = (Math.PI * (widthM * widthM - insideM * insideM)) / 4
      expect(Math.abs(row.areaM2 / ring - 1)).toBeLessThan(1e-12)
    }
  })

  test('what carries of a square tube is its outer square less its inner one', () => {
    for (const { widthM, wallM, areaM2 } of aluminiumSquareTubes) {
      const insideM = widthM! - 2 * wallM
      expect(Math.abs(areaM2 / (widthM! * widthM! - insideM * insideM) - 1)).toBeLessThan(1e-12)
    }
  })

  test('stiffness is E A / length, and a name that is in no row is refused', () => {
    const row = stockRow(springStrips, 'spring-steel strip 10 x 0.2 mm')
    expect(axialStiffnessNpm(row, 0.1)).toBeCloseTo((206e9 * 0.01 * 0.0002) / 0.1, 3)
    expect(() => stockRow(springStrips, 'bamboo')).toThrow(/a row named bamboo/)
  })
})

describe('actuators', () => {
  test.each(actuators.map((row) => [row.name, row] as const))('%s stays inside its kind', (_, row) => {
    expect(row.pulls || row.pushes).toBe(true)
    expect(row.powerMost).toBeLessThanOrEqual(row.forceMost * row.rateMostPerSecond)
    // Amplitude at most 25 % pneumatic, 5 % shape memory (makers; the second as the recovery of many cycles).
    if (row.kind === 'bellows' || row.kind === 'fluidic muscle') {
      expect(row.strokeMost).toBeLessThanOrEqual(0.25)
      // Pressures of 0 to 6 bar in tests of makers (read).
      expect(row.gasPressurePa).toBeLessThanOrEqual(600e3)
    }
    if (row.kind === 'shape-memory wire') {
      expect(2 * row.strokeMost!).toBeLessThanOrEqual(0.05)
      expect(row.hottestC).toBeGreaterThanOrEqual(70)
    }
    if (row.motion === 'rotary') expect(row.voltageV).toBeGreaterThan(0)
  })

  // Chou and Hannaford, Measurement and modeling of McKibben pneumatic artificial muscles, 1996 (from memory);
  // values recomputed.
  test.each([
    [15, 0.402283],
    [20, 0.385597],
    [25, 0.362964],
    [30, 1 / 3],
  ])('an ideal braid of %d degrees contracts by %d at most', (degrees, contraction) => {
    expect(Math.abs(braidContractionMost(radians(degrees)) - contraction)).toBeLessThan(0.6e-6)
  })

  test('a braid has no force left at 54.7356 degrees, where its contraction ends', () => {
    expect(Math.abs(braidForceN(600e3, 0.03, radians(54.7356)))).toBeLessThan(0.01)
    expect(braidForceN(600e3, 0.03, radians(54))).toBeGreaterThan(1)
    expect(braidForceN(600e3, 0.03, radians(56))).toBeLessThan(0)
  })

  test('the fluidic muscle is no stronger than an ideal braid of its bore, and no longer in stroke', () => {
    // At rest a bore of 10 mm and 20 degrees: 29.2 mm at 90 degrees.
    const row = actuatorClasses.fluidicMuscle
    const diameterAt90M = 0.01 / Math.sin(radians(20))
    expect(row.forceMost).toBeLessThan(braidForceN(row.gasPressurePa, diameterAt90M, radians(20)))
    expect(2 * row.strokeMost).toBeLessThan(braidContractionMost(radians(20)))
  })

  test('the memory wire is stressed no more than makers call safe', () => {
    // 172 MPa "maximum safe" for many uses (a maker's sheet, read).
    const { forceMost } = actuatorClasses.memoryWire
    expect(forceMost / ((Math.PI * 0.25e-3 ** 2) / 4)).toBeLessThanOrEqual(172e6 * (1 + 1e-12))
  })

  test('limits of a strut are those of its class, power by length', () => {
    // A straight line from force to speed gives a quarter of their product: 5.6549 N, 0.06 m at 1.2 1/s.
    const { forceLimitN, strainLimit, strainRateLimitPerSecond, powerLimitW } = strutLimits(
      actuatorClasses.bellows,
      0.06,
    )
    expect([strainLimit, strainRateLimitPerSecond]).toEqual([0.25, 1.2])
    expect(forceLimitN).toBeCloseTo(5.6549, 4)
    expect(powerLimitW).toBeCloseTo((5.6549 * 1.2 * 0.06) / 4, 5)
    expect(() => strutLimits(actuatorClasses.wormGearedMotor, 0.1)).toThrow(/linear/)
  })

  test('the bellows pushes with pressure times bore', () => {
    // 50 kPa on a circle of 12 mm.
    expect(bellowsForceN(smallBellows.pressurePa, smallBellows.boreAreaM2)).toBeCloseTo(5.6549, 4)
  })
})

describe('friction', () => {
  test('ranges are ranges, and what feet are tried over covers rubber on wet concrete', () => {
    for (const { low, high } of frictionRows) {
      expect(low).toBeGreaterThan(0)
      expect(high).toBeGreaterThan(low)
    }
    expect(rubberFriction).toEqual({ low: 0.3, high: 1.2 })
  })
})

test('every number has a source, or says that it has none', () => {
  const sources = [...materials, ...stock, ...actuators, ...frictionRows].map(({ source }) => source)
  for (const source of sources) {
    expect(source).toMatch(/\b(19|20)\d\d\b|data sheet|maker|from memory|no source|assumed|trade|PMC\d+/)
  }
})
