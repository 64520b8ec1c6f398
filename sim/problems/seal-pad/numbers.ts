// The numbers of the seal pad's world, each with where it comes from. SI units. The machine and the water works are
// invented; the numbers are ordinary ones of the trade, good enough for comparing designs, not for building.

import { mouldedWalls } from '../../../shared/making/stock.js'
import { mouldedRubberToleranceM } from '../../../shared/making/tolerances.js'
import type { StockRow } from '../../../shared/making/types.js'

const quarterWidthM = 0.02
const wallsM = { thin: 0.001, middle: 0.0015, thick: 0.002 }
const wallToleranceM = mouldedRubberToleranceM(wallsM.thick, 'M2')

/** Rows of the workshop's table of moulded walls: three rubbers, softest first, and in each the three thicknesses. */
const stock: readonly StockRow[] = mouldedWalls
  .filter(({ wallM }) => Object.values(wallsM).includes(wallM))
  .map((row) => ({ ...row, wallToleranceM, source: `${row.source}; here a careful mould, M2` }))

export const numbers = {
  stock,
  rubbers: [...new Set(stock.map((row) => row.material))],
  // Shear factor of a rectangular section (common practice).
  shearFactor: 5 / 6,

  // The quarter of a cell that is evolved; the whole cell is four mirrored quarters. Assumed.
  quarterWidthM,
  quarterHeightM: { low: 0.016, high: 0.036 },
  /** Inner nodes stay this part of the quarter's sides away from its corners, and 1 - this. */
  placeLeast: 0.2,
  /** Rubber walls below about 1 mm do not fill well (rule of thumb). */
  wallsM,
  /** A wall is at least this many times as long as thick, or it is cast thinner. Assumed. */
  slendernessLeast: 2,
  /** Steel cores of a mould stand between the walls; thinner ones bend. Assumed. */
  gapLeastM: 0.002,

  // The pad itself: packs the gap between a pipe and its opening in a wall, or a hatch and its frame. Assumed.
  padM: { length: 0.32, height: 0.12, depth: 0.04 },
  /** A pad that is more rubber than this is no structure of walls: joints are then as large as walls. Assumed. */
  densityMost: 0.5,

  // Scatter. Moulded rubber of ISO 3302-1, class M2 (a careful mould), dimensions fixed in the mould: +-0.10 mm on
  // walls, +-0.25 mm on places of nodes (16 to 25 mm); taken as two standard deviations, nothing outside. The spread of the modulus
  // between batches (the material's row, +-30 %) is taken as three standard deviations.
  wallToleranceM,
  /** How far a wall's middle may be out of line: as much as its thickness may be off. Assumed. */
  bowToleranceM: wallToleranceM,
  placeToleranceM: mouldedRubberToleranceM(quarterWidthM, 'M2'),

  /** Squeeze at which the pad works, of its height. Assumed. */
  workingSqueeze: 0.04,
  squeezeSteps: 4,
  /** Pieces of a wall while it is squeezed: a wall in one piece buckles a fifth too late (12 for pi^2). */
  squeezePieces: 2,

  /** Wanted: draws in by 0.8 of what it is squeezed, softer than sponge rubber. Assumed. */
  wanted: { poisson: -0.8, modulusPa: 20e3 },

  framesPerSecond: 10,
  frameCount: 30,
  /** Cells of the block that the replay squeezes. */
  blockCells: { across: 4, up: 3 },
} as const
