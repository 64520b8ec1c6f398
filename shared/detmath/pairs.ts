// Exact products as sums of two doubles (Dekker: A floating-point technique for extending the available
// precision, 1971), without fused instructions.

/** x in two parts of at most 26 bits: this is the upper one (Veltkamp). |x| must stay below 2^996. */
function upperPart(x: number): number {
  const t = 134217729 * x
  return t - (t - x)
}

/** x * y - product, exact, where product is the rounded x * y and neither overflows nor underflows. */
export function exactProductTail(x: number, y: number, product: number): number {
  const xh = upperPart(x)
  const xl = x - xh
  const yh = upperPart(y)
  const yl = y - yh
  return xl * yl - (product - xh * yh - xl * yh - xh * yl)
}
