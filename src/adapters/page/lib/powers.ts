/** Full length of the bars [h]: the next round figure that holds the longest. */
export function roundHours(longest: number): number {
  const steps = [1, 2, 4, 6, 8, 12, 16, 24, 36, 48, 72, 96, 168];
  return steps.find((step) => step >= longest) ?? Math.ceil(longest / 168) * 168;
}

/** More than any machine has, and than the server takes [MW]. */
const GREATEST_MW = 10_000;

/** A power typed by the user: `1,8` is one and eight tenths here. null where it is no power. */
export function typedPower(text: string): number | null {
  const plain = text.trim().replace(',', '.');
  if (!/^\d+(\.\d+)?$|^\.\d+$/.test(plain)) return null;
  const value = Number(plain);
  return value > 0 && value <= GREATEST_MW ? value : null;
}

const SAME_SHARE = 0.02;

/** Whether a reading is that power: readings scatter, and two rows of one power would confuse. */
export const isSamePower = (read_MW: number, power_MW: number): boolean =>
  Math.abs(read_MW - power_MW) <= SAME_SHARE * power_MW;
