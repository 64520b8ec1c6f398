// How far two doubles are apart, in units in the last place: the number of steps between neighbouring
// doubles that lead from one to the other.

const view = new DataView(new ArrayBuffer(8))

/** The position of a finite double on the line of all doubles; neighbours differ by 1, 0 and -0 by nothing. */
function position(value: number): bigint {
  view.setFloat64(0, value)
  const bits = view.getBigInt64(0)
  return bits < 0n ? -(bits & 0x7fff_ffff_ffff_ffffn) : bits
}

/** Steps between neighbouring doubles from a to b; both finite. */
export function ulpDistance(a: number, b: number): bigint {
  const steps = position(a) - position(b)
  return steps < 0n ? -steps : steps
}
