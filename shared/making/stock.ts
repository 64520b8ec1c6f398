// The stock of the (invented) workshop: rows of sizes and materials, supplier-neutral, with their spread. A problem
// takes the rows its machines are made of into its `process`; its stiffness classes are such rows.

import { check } from '../check.js'
import { metals, silicones } from './materials.js'
import { mouldedRubberToleranceM } from './tolerances.js'
import type { Material, StockForm, StockRow } from './types.js'

/** '0.25', '16' */
const mm = (metres: number) => String(Number((metres * 1000).toFixed(3)))

/** A tube of `meanDiameterM` and `wallM`; what carries is pi times both. */
export function tube(
  material: Material,
  meanDiameterM: number,
  wallM: number,
  given: Pick<StockRow, 'name' | 'wallToleranceM' | 'source'> & Partial<StockRow>,
): StockRow {
  return {
    form: 'tube',
    material,
    widthM: meanDiameterM + wallM,
    wallM,
    areaM2: Math.PI * meanDiameterM * wallM,
    lengthLeastM: 0.02,
    lengthMostM: 2,
    ...given,
  }
}

const castTubeSource = 'cast or bought by the metre; wall by ISO 3302-1 M3 (trade tables); lengths assumed'

function castTube(shoreA: string, material: Material, meanDiameterM: number, wallM: number): StockRow {
  return tube(material, meanDiameterM, wallM, {
    name: `silicone tube ${mm(meanDiameterM + wallM)} x ${mm(meanDiameterM - wallM)} mm, ${shoreA}`,
    wallToleranceM: mouldedRubberToleranceM(wallM),
    source: castTubeSource,
  })
}

/** Tubes of 17 mm outside and 15 mm inside, the struts of soft machines. */
export const siliconeTubes = {
  a10: castTube('10 A', silicones.a10, 0.016, 0.001),
  a20: castTube('20 A', silicones.a20, 0.016, 0.001),
  a30: castTube('30 A', silicones.a30, 0.016, 0.001),
} as const satisfies { readonly [shoreA: string]: StockRow }

/** What carries of a strip, sheet, rod or wire. */
function solid(
  form: StockForm,
  material: Material,
  widthM: number,
  wallM: number,
  given: Pick<StockRow, 'name' | 'wallToleranceM' | 'source'> & Partial<StockRow>,
): StockRow {
  const isRound = form === 'rod' || form === 'wire'
  return {
    form,
    material,
    widthM,
    wallM,
    areaM2: isRound ? (Math.PI * wallM * wallM) / 4 : widthM * wallM,
    lengthLeastM: 0.01,
    lengthMostM: 2,
    ...given,
  }
}

/** Thicknesses in which hardened strip is sold, m (trade lists, from memory). */
export const stripThicknessesM = [
  0.0001, 0.00015, 0.0002, 0.00025, 0.0003, 0.0004, 0.0005, 0.0006, 0.0008, 0.001,
] as const
/** Diameters in which spring wire is sold, m (trade lists, from memory). */
export const wireDiametersM = [0.0005, 0.0006, 0.0008, 0.001, 0.0012, 0.0016, 0.002, 0.0025, 0.003] as const

/** Hardened spring-steel strip 10 mm wide. */
export const springStrips: readonly StockRow[] = stripThicknessesM.map((wallM) =>
  solid('strip', metals.springSteel, 0.01, wallM, {
    name: `spring-steel strip 10 x ${mm(wallM)} mm`,
    // About 5 % of the thickness and at least 5 micrometres.
    wallToleranceM: Math.max(5e-6, 0.05 * wallM),
    source: 'EN 10140, Cold rolled narrow steel strip: tolerances, 2006, from memory; lengths assumed',
  }),
)

export const springWires: readonly StockRow[] = wireDiametersM.map((wallM) =>
  solid('wire', metals.springSteel, wallM, wallM, {
    name: `spring wire ${mm(wallM)} mm`,
    wallToleranceM: Math.max(1e-5, 0.015 * wallM),
    source: 'EN 10270-1, Steel wire for mechanical springs, 2011, from memory; lengths assumed',
  }),
)

/** Outside x wall of stainless tube, for linkages that stand in water, m (trade lists, from memory). */
const steelTubes = [
  [0.008, 0.001],
  [0.01, 0.001],
  [0.012, 0.001],
  [0.016, 0.0015],
  [0.02, 0.002],
  [0.025, 0.002],
] as const
export const stainlessTubes: readonly StockRow[] = steelTubes.map(([outsideM, wallM]) =>
  tube(metals.stainlessSteel, outsideM - wallM, wallM, {
    name: `stainless tube ${mm(outsideM)} x ${mm(wallM)} mm`,
    widthM: outsideM,
    wallToleranceM: 0.1 * wallM,
    lengthLeastM: 0.03,
    lengthMostM: 6,
    source: 'EN ISO 1127, Stainless steel tubes: dimensions and tolerances, 1996, from memory',
  }),
)

/** Side x wall of aluminium square tube, for links and frames, m (trade lists, from memory). */
const squareSizes = [
  [0.02, 0.002],
  [0.03, 0.002],
  [0.04, 0.003],
  [0.05, 0.003],
] as const
export const aluminiumSquareTubes: readonly StockRow[] = squareSizes.map(([widthM, wallM]) => ({
  name: `aluminium square tube ${mm(widthM)} x ${mm(wallM)} mm`,
  form: 'square-tube',
  material: metals.aluminium,
  widthM,
  wallM,
  areaM2: 4 * (widthM - wallM) * wallM,
  lengthLeastM: 0.05,
  lengthMostM: 6,
  // +- 0.25 mm on walls of such profiles.
  wallToleranceM: 0.00025,
  source: 'EN 755-9, Aluminium extruded profiles: tolerances, 2016, from memory',
}))

/** Diameters of stainless round bar, m (trade lists, from memory). */
export const stainlessRods: readonly StockRow[] = [0.004, 0.005, 0.006, 0.008, 0.01, 0.012].map((wallM) =>
  solid('rod', metals.stainlessSteel, wallM, wallM, {
    name: `stainless rod ${mm(wallM)} mm`,
    // h9: 0.030 mm up to 6 mm, 0.036 mm up to 10 mm, 0.043 mm up to 18 mm, all below the nominal size.
    wallToleranceM: wallM <= 0.006 ? 0.00003 : wallM <= 0.01 ? 0.000036 : 0.000043,
    lengthMostM: 3,
    source: 'ISO 286-2, Tolerance classes, 2010, from memory (h9)',
  }),
)

/** Thicknesses of moulded silicone walls that come out of a mould and fill, m (rule of thumb, from memory). */
export const mouldedWallsM = [0.001, 0.0015, 0.002, 0.003, 0.004, 0.006] as const
/** Walls of moulded silicone, 1 m wide in the table: a pad's depth scales its area. */
export const mouldedWalls: readonly StockRow[] = (['a20', 'a30', 'a50'] as const).flatMap((hardness) =>
  mouldedWallsM.map((wallM) =>
    solid('moulded', silicones[hardness], 1, wallM, {
      name: `moulded silicone wall ${mm(wallM)} mm, ${hardness.slice(1)} A`,
      wallToleranceM: mouldedRubberToleranceM(wallM),
      lengthLeastM: 0.003,
      lengthMostM: 0.4,
      source:
        'thicknesses and lengths: rule of thumb, from memory; tolerance by ISO 3302-1 M3 (trade tables)',
    }),
  ),
)

/** The row of that name; a name that is in no row is a mistake of ours. */
export function stockRow(rows: readonly StockRow[], name: string): StockRow {
  const row = rows.find((one) => one.name === name)
  check(row !== undefined, `stock has a row named ${name}`)
  return row
}

/** Axial stiffness (N/m) of a straight piece: E A / length. */
export function axialStiffnessNpm(row: StockRow, lengthM: number): number {
  return (row.material.youngPa * row.areaM2) / lengthM
}
