import { readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { parse, stringify } from 'yaml';
import { parseSite } from '../../src/config/parse.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { unitWith } from '../score/sensorSets.js';
import { GEOMETRY, SCAN_S, type UnitKind } from './branches.js';

/** The demonstration unit as it is, or with the thermocouples near the top of its beds. */
export function watchedUnit(kind: UnitKind): UnitDefinition {
  if (kind === 'demo') return unitWith('all', 'class');
  const file = fileURLToPath(new URL('../../config/demo.yaml', import.meta.url));
  const site = parse(readFileSync(file, 'utf8'));
  const [unit] = site.units;
  unit.scan_period_s = SCAN_S;
  for (const store of GEOMETRY.stores) {
    const block = unit.stores.find((one: { id: string }) => one.id === store.id);
    block.strings = store.strings.map((string) => ({
      ...block.strings.find((one: { id: string }) => one.id === string.id),
      measured_from: 'charge_inlet',
      positions_m: string.thermocouples.map((t) => t.position_m),
      ids: string.thermocouples.map((t) => t.id),
    }));
  }
  const parsed = parseSite(stringify(site, { aliasDuplicateObjects: false }), '.');
  const found = parsed.site?.units[0];
  if (!found) throw new Error(`unit with top thermocouples: ${JSON.stringify(parsed.faults)}`);
  return found;
}
