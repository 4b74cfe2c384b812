const MODE_WORDS: Readonly<Record<string, number>> = { charge: 1, stand: 0, discharge: -1 };
const VALVE_WORDS: Readonly<Record<string, number>> = { open: 1, true: 1, closed: 0, false: 0 };

function lookUp(words: Readonly<Record<string, number>>, text: string): number {
  const word = text.trim().toLowerCase();
  return Object.hasOwn(words, word) ? (words[word] as number) : Number.NaN;
}

/** The mode that a word stands for: charge +1, stand 0, discharge -1; NaN for any other word. */
export function modeOfWord(text: string): number {
  return lookUp(MODE_WORDS, text);
}

/** How open a valve is by a word: open or true 1, closed or false 0; NaN for any other word. */
export function openingOfWord(text: string): number {
  return lookUp(VALVE_WORDS, text);
}
