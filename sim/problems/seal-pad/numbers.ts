// The numbers of the seal pad's world, each with where it comes from. SI units. The machine and the water works are
// invented; the numbers are ordinary ones of the trade, good enough for comparing designs, not for building.

import { mouldedWalls } from '../../../shared/making/stock.js'
import { mouldedRubberToleranceM } from '../../../shared/making/tolerances.js'
import type { StockRow } from '../../../shared/making/types.js'

const quarterWidthM = 0.02
const wallsM = { thin: 0.001, middle: 0.0015, thick: 0.002 }
const padM = { length: 0.32, height: 0.12, depth: 0.04 }
const workingSqueeze = 0.04

/**
 * What the pads are for, from which the wanted pair follows. A hatch lies on four of them, one in each side of its frame,
 * and is closed by nothing but its own weight: a lid of aluminium sheet, 0.6 by 0.6 m and 4 mm thick (3.9 kg at
 * 2700 kg/m3), with hinge and handle. Under it a pad must come down by the working squeeze, neither less (it does not
 * seat) nor more (its walls wear). At either end of its seat there is a slot that drains the frame. The pad covers it
 * while the hatch is open, and must leave it free once the hatch is closed: so it has to draw in. Assumed but for the
 * density (textbooks, from memory).
 */
const need = { lidKg: 4.2, gravityMps2: 9.81, padsUnderLid: 4, slotM: 0.005 }
const pressurePa = (need.lidKg * need.gravityMps2) / (need.padsUnderLid * padM.length * padM.depth)

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

  // The pad itself, which lies between a hatch and its frame. Assumed.
  padM,
  need,
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
  workingSqueeze,
  squeezeSteps: 4,
  /** Pieces of a wall while it is squeezed: a wall in one piece buckles a fifth too late (12 for pi^2). */
  squeezePieces: 2,

  /**
   * Wanted: at the working squeeze both ends have drawn in by a slot (-0.78), and a pad carries its part of the lid
   * (20.1 kPa, softer than sponge rubber).
   */
  wanted: {
    poisson: -(2 * need.slotM) / padM.length / workingSqueeze,
    modulusPa: pressurePa / workingSqueeze,
  },
  /**
   * How far off is still near. 0.1 in the ratio is an eighth of the slot; 0.25 in the logarithm of the modulus seats the lid at
   * 3.1 % to 5.1 %, and is what batches of rubber do to any pad (+-30 %). Assumed.
   */
  tolerance: { poisson: 0.1, logModulus: 0.25 },

  framesPerSecond: 10,
  frameCount: 30,
  /** Cells of the block that the replay squeezes. */
  blockCells: { across: 4, up: 3 },
} as const
