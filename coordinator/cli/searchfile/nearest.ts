// The name a person probably meant: smallest edit distance (insert, delete, replace, swap of neighbours), only when it
// is small against the length of the word.
// Source: the optimal-string-alignment form of Damerau (1964) and Levenshtein (1966), from memory.

/** Edits that turn a into b, neighbours' swap counting as one. */
export function editDistance(a: string, b: string): number {
  let beforeLast: number[] = []
  let last = Array.from({ length: b.length + 1 }, (_, j) => j)
  for (let i = 1; i <= a.length; i++) {
    const row = [i]
    for (let j = 1; j <= b.length; j++) {
      const replace = last[j - 1]! + (a[i - 1] === b[j - 1] ? 0 : 1)
      let edits = Math.min(last[j]! + 1, row[j - 1]! + 1, replace)
      const swapped = i > 1 && j > 1 && a[i - 1] === b[j - 2] && a[i - 2] === b[j - 1]
      if (swapped) edits = Math.min(edits, beforeLast[j - 2]! + 1)
      row.push(edits)
    }
    beforeLast = last
    last = row
  }
  return last[b.length]!
}

/** The nearest of `names`, or undefined when none is near. Case and -/_ do not count; ties go to the first. */
export function nearestName(word: string, names: readonly string[]): string | undefined {
  const plain = (name: string) => name.toLowerCase().replace(/[-_ ]/g, '')
  const wanted = plain(word).slice(0, 80)
  let best: string | undefined
  let fewest = Math.max(1, Math.round(0.4 * wanted.length)) + 1
  for (const name of names) {
    const edits = editDistance(wanted, plain(name))
    if (edits < fewest) {
      best = name
      fewest = edits
    }
  }
  return best
}
