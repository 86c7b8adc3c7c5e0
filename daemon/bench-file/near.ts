/** The known word nearest to a mistyped one, or null where none is near enough to be meant. */
export function nearest(word: string, known: readonly string[]): string | null {
  const tidy = (text: string): string => text.toLowerCase().replace(/[\s_]+/g, "-");
  let best: string | null = null;
  // A third of the letters may differ; more is another word.
  let least = Math.floor(word.length / 3) + 1;
  for (const candidate of known) {
    const distance = editDistance(tidy(word).slice(0, 40), tidy(candidate));
    if (distance < least) {
      least = distance;
      best = candidate;
    }
  }
  return best;
}

/** Damerau–Levenshtein distance (adjacent letters may swap), by the full table: words are short. */
function editDistance(a: string, b: string): number {
  const width = b.length + 1;
  const table = new Uint16Array((a.length + 1) * width);
  const at = (i: number, j: number): number => table[i * width + j] ?? 0;
  for (let i = 0; i <= a.length; i += 1) table[i * width] = i;
  for (let j = 0; j <= b.length; j += 1) table[j] = j;
  for (let i = 1; i <= a.length; i += 1) {
    for (let j = 1; j <= b.length; j += 1) {
      const differs = a.charCodeAt(i - 1) === b.charCodeAt(j - 1) ? 0 : 1;
      let least = Math.min(at(i - 1, j) + 1, at(i, j - 1) + 1, at(i - 1, j - 1) + differs);
      const swapped =
        i > 1 &&
        j > 1 &&
        a.charCodeAt(i - 1) === b.charCodeAt(j - 2) &&
        a.charCodeAt(i - 2) === b.charCodeAt(j - 1);
      if (swapped) least = Math.min(least, at(i - 2, j - 2) + 1);
      table[i * width + j] = least;
    }
  }
  return at(a.length, b.length);
}
