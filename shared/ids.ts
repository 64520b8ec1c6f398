// Ids people can say. An individual is an island and its number there: i3-01842; a control's is c1-00012.
// As a number it is island * 2^40 + number, so that ids sort by island, then by birth.

const numbersPerIsland = 2 ** 40
/** Islands of controls are numbered from here on. */
export const firstControl = 1001

export function idOf(island: number, number: number): number {
  return island * numbersPerIsland + number
}
export function islandOf(id: number): number {
  return Math.floor(id / numbersPerIsland)
}
export function numberOf(id: number): number {
  return id % numbersPerIsland
}

/** 'i3', or 'c1' for a control. */
export function islandName(island: number): string {
  return island >= firstControl ? `c${island - firstControl + 1}` : `i${island}`
}

/** 'i3-01842', at least five digits, the same in every output. */
export function nameOf(id: number): string {
  return `${islandName(islandOf(id))}-${String(numberOf(id)).padStart(5, '0')}`
}

/** The id behind a name, or undefined when the name is not one. */
export function parseName(name: string): number | undefined {
  const match = /^([ic])([1-9]\d{0,3})-(\d{5,12})$/.exec(name)
  if (!match) return undefined
  const index = Number(match[2])
  return idOf(match[1] === 'c' ? firstControl + index - 1 : index, Number(match[3]))
}
