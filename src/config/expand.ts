import type { StringBlock } from './schema/channels.js';
import type { UnitBlock } from './schema/site.js';
import type { StoreBlock } from './schema/store.js';

/** The thermocouples of a string block, in the order in which the block lists them. */
export interface ExpandedString {
  /** 01, 02, ... as patterns name the thermocouples. */
  readonly numbers: readonly string[];
  readonly ids: readonly string[];
  /** Distances from the charge inlet [m]. */
  readonly x_m: readonly number[];
  /** One topic per thermocouple for payload value; a single one for array; none for sparkplug. */
  readonly topics: readonly string[];
}

export function expandString(
  unitId: string,
  store: StoreBlock,
  string: StringBlock,
  inPrefix: string,
): ExpandedString {
  const count = string.positions_m.length;
  const digits = Math.max(2, String(count).length);
  const number = (i: number) => String(i + 1).padStart(digits, '0');
  const ids = Array.isArray(string.ids)
    ? string.ids
    : string.positions_m.map((_, i) =>
        fill(string.ids as string, { store: store.id, string: string.id, n: number(i) }),
      );
  const base = string.topic ?? `${inPrefix}/${unitId}/${store.id}/${string.id}`;
  const topics =
    string.payload === 'sparkplug'
      ? []
      : string.payload === 'array'
        ? [base]
        : string.positions_m.map((_, i) =>
            fill(string.topic === undefined ? `${base}/{id}` : base, {
              id: ids[i] ?? '',
              n: number(i),
            }),
          );
  const numbers = string.positions_m.map((_, i) => number(i));
  return { ids, x_m: positionsFromInlet(store, string), topics, numbers };
}

/** Distances from the charge inlet [m] of positions counted from either end. */
export function positionsFromInlet(store: StoreBlock, string: StringBlock): number[] {
  const fromInlet =
    string.measured_from === 'charge_inlet' || string.measured_from === store.charge_inlet_at;
  return string.positions_m.map((p) => (fromInlet ? p : store.bed.height_m - p));
}

/**
 * Share of the cross-section of each string: the explicit ones, else the ring between the
 * mid-radii to the neighbours, r from 0 to the bed's radius R: (r_out^2 - r_in^2)/R^2. Strings
 * at the same radius share their ring evenly.
 */
export function areaShares(store: StoreBlock): number[] {
  const explicit = store.strings.map((s) => s.area_share);
  if (explicit.every((share) => share !== undefined)) {
    const total = explicit.reduce<number>((sum, share) => sum + share!, 0);
    return explicit.map((share) => share! / total);
  }
  const edge = store.bed.diameter_m / 2;
  const radii = [...new Set(store.strings.map((s) => s.radius_m))].sort((a, b) => a - b);
  return store.strings.map((s) => {
    const k = radii.indexOf(s.radius_m);
    const inner = k === 0 ? 0 : (radii[k - 1]! + radii[k]!) / 2;
    const outer = k === radii.length - 1 ? edge : (radii[k]! + radii[k + 1]!) / 2;
    const alike = store.strings.filter((other) => other.radius_m === s.radius_m).length;
    return (outer * outer - inner * inner) / (edge * edge) / alike;
  });
}

export function channelTopic(
  unit: UnitBlock,
  channel: UnitBlock['channels'][number],
  inPrefix: string,
) {
  return channel.topic ?? `${inPrefix}/${unit.id}/${channel.id}`;
}

/** A pattern with its words put in; words that are not known stay as they are. */
export function fill(pattern: string, words: Readonly<Record<string, string>>): string {
  return pattern.replace(/\{(\w+)\}/g, (whole, word: string) =>
    Object.hasOwn(words, word) ? words[word]! : whole,
  );
}
