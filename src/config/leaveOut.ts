import type { Path } from './faults.js';

/** A unit of a file by its place there, and what is wrong with it. */
export interface FaultyUnit<F> {
  /** Place among all units of the file. */
  readonly place: number;
  readonly faults: readonly F[];
}

/**
 * Leaves units out until what is left is sound: what is wrong with one unit is no reason to stand
 * blind before the others. A name or topic that two units claim stays with the first of them.
 *
 * @param judge faults of a site, by their paths there; none where it is sound
 * @param data a site with faults
 * @returns the sound rest and what was left out; null where a fault lies outside the units, or where
 *   no unit would be left
 */
export function leaveOut<F extends { readonly path: Path }>(
  data: unknown,
  judge: (data: unknown) => readonly F[],
): { readonly data: unknown; readonly faulty: readonly FaultyUnit<F>[] } | null {
  if (typeof data !== 'object' || data === null || !('units' in data)) return null;
  const { units } = data;
  if (!Array.isArray(units)) return null;
  let kept = units.map((_, place) => place);
  const faulty: FaultyUnit<F>[] = [];
  for (;;) {
    const rest = { ...data, units: kept.map((place) => units[place] as unknown) };
    const faults = judge(rest);
    if (faults.length === 0) return { data: rest, faulty: inOrder(faulty) };
    const own = new Map<number, F[]>();
    for (const fault of faults) {
      const [block, index, ...key] = fault.path;
      if (block !== 'units' || typeof index !== 'number') return null;
      const place = kept[index]!;
      own.set(place, [...(own.get(place) ?? []), { ...fault, path: [block, place, ...key] }]);
    }
    kept = kept.filter((place) => !own.has(place));
    if (kept.length === 0) return null;
    for (const [place, list] of own) faulty.push({ place, faults: list });
  }
}

function inOrder<F>(faulty: readonly FaultyUnit<F>[]): FaultyUnit<F>[] {
  return [...faulty].sort((a, b) => a.place - b.place);
}
