/**
 * Damerau-Levenshtein distance in its optimal-string-alignment form: insertions, deletions,
 * replacements and swaps of neighbours (Damerau 1964); typing errors are mostly one of these.
 */
export function editDistance(a: string, b: string): number {
  const width = b.length + 1;
  const d = new Uint16Array((a.length + 1) * width);
  const at = (i: number, j: number) => d[i * width + j]!;
  for (let i = 0; i <= a.length; i++) d[i * width] = i;
  for (let j = 0; j <= b.length; j++) d[j] = j;
  for (let i = 1; i <= a.length; i++) {
    for (let j = 1; j <= b.length; j++) {
      const same = a[i - 1] === b[j - 1] ? 0 : 1;
      let best = Math.min(at(i - 1, j) + 1, at(i, j - 1) + 1, at(i - 1, j - 1) + same);
      if (i > 1 && j > 1 && a[i - 1] === b[j - 2] && a[i - 2] === b[j - 1]) {
        best = Math.min(best, at(i - 2, j - 2) + 1);
      }
      d[i * width + j] = best;
    }
  }
  return at(a.length, b.length);
}

/** The known word that was probably meant, or null where none is near. */
export function nearest(word: string, known: readonly string[]): string | null {
  if (word.length > 200) return null;
  const bare = bareWord(word);
  let best: string | null = null;
  let bestScore = Number.POSITIVE_INFINITY;
  for (const candidate of known) {
    // A wrong or missing unit in a key (`height` or `height_mm` for `height_m`) counts as one slip.
    const byStem = stem(bare) === stem(bareWord(candidate)) ? 1 : Number.POSITIVE_INFINITY;
    const score = Math.min(byStem, editDistance(bare, bareWord(candidate)));
    const allowed = Math.max(1, Math.floor(candidate.length / 3));
    if (score <= allowed && score < bestScore) {
      best = candidate;
      bestScore = score;
    }
  }
  return best;
}

function bareWord(word: string): string {
  return word.toLowerCase().replaceAll('-', '_');
}

const UNIT_ENDING =
  /_(m|mm|cm|km|degc|c|k|f|s|ms|min|h|d|days|hours|bar|pa|kpa|mpa|mw|kw|w|mw_el|kw_el|kg_s|kg_h|kg_m3|w_m2k|j_kgk|kj_kgk|w_mk|mpa_s|m2|m3|kj_k)$/;
function stem(word: string): string {
  return word.replace(UNIT_ENDING, '');
}
