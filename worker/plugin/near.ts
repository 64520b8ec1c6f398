// File names like the one that was asked for.

/** At most three of `names` that share most letter pairs with `word`, nearest first (Dice 1945, from memory). */
export function nearNames(word: string, names: readonly string[]): string[] {
  const wanted = letterPairs(word)
  const scored = names.map((name) => ({ name, likeness: likeness(wanted, letterPairs(name)) }))
  return scored
    .filter((entry) => entry.likeness >= 0.4)
    .sort((a, b) => b.likeness - a.likeness || (a.name < b.name ? -1 : 1))
    .slice(0, 3)
    .map((entry) => entry.name)
}

function letterPairs(word: string): Set<string> {
  const plain = word.toLowerCase()
  return new Set(Array.from({ length: Math.max(0, plain.length - 1) }, (_, i) => plain.slice(i, i + 2)))
}

function likeness(a: Set<string>, b: Set<string>): number {
  let common = 0
  for (const pair of a) if (b.has(pair)) common++
  return (2 * common) / Math.max(1, a.size + b.size)
}
