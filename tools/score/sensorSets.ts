import { readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { parse, stringify } from 'yaml';
import { parseSite } from '../../src/config/parse.js';
import type { UnitDefinition } from '../../src/core/definitions.js';

/** Scan period of everything that is scored [s]. */
export const SCAN_S = 60;

/** Thermocouples of each store. */
export type SensorSet = 'all' | 'five' | 'three';
/** What is wrong with the thermocouples: an offset each, or all that their class allows. */
export type ErrorModel = 'independent' | 'class';

export const SET_WORDS: Readonly<Record<SensorSet, string>> = {
  all: '3 x 14',
  five: '5 on one string',
  three: '3 on one string',
};

const file = fileURLToPath(new URL('../../config/demo.yaml', import.meta.url));
const built = new Map<string, UnitDefinition>();

/**
 * The demonstration unit with one of the sensor sets. What its operator knows stands in its file as
 * he would write it: where thermocouples are calibrated one by one and placed with care, no group
 * shares an offset and positions are good to a millimetre.
 */
export function unitWith(set: SensorSet, errors: ErrorModel): UnitDefinition {
  const name = `${set} ${errors}`;
  const known = built.get(name);
  if (known) return known;
  const site = parse(readFileSync(file, 'utf8'));
  const [unit] = site.units;
  unit.scan_period_s = SCAN_S;
  if (errors === 'independent') {
    unit.estimator = { ...unit.estimator, group_offset_sigma_K: 0.02, position_sigma_mm: 1 };
  }
  if (set !== 'all') {
    for (const store of unit.stores) store.strings = [singleString(store, set)];
  }
  // Anchors of the file would be lost in the copies; plain text has none.
  const parsed = parseSite(stringify(site, { aliasDuplicateObjects: false }), '.');
  const found = parsed.site?.units[0];
  if (!found) throw new Error(`unit with ${name}: ${JSON.stringify(parsed.faults)}`);
  built.set(name, found);
  return found;
}

interface StoreBlock {
  readonly bed: { readonly height_m: number; readonly diameter_m: number };
  strings: { readonly group: string }[];
}

/** One string at the area-mean radius 2 R/3, with thermocouples in the middle of equal parts. */
function singleString(store: StoreBlock, set: 'five' | 'three') {
  const count = set === 'five' ? 5 : 3;
  const { height_m, diameter_m } = store.bed;
  return {
    id: set,
    radius_m: (2 / 3) * (diameter_m / 2),
    group: store.strings[0]!.group,
    positions_m: Array.from({ length: count }, (_, i) => ((i + 0.5) * height_m) / count),
  };
}
