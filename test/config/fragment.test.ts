import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { fragmentFaults, mergeFragment } from '../../src/config/fragment.js';
import { parseSite } from '../../src/config/load.js';

const PATH = 'config/demo.yaml';
const text = readFileSync(PATH, 'utf8');
const FRAGMENT = `units:
  - id: vellmoor
    machine:
      work_factor_charge: 0.97
      work_factor_discharge: 1.04
    stores:
      - id: cold
        factors:
          heat_transfer: 0.8
          gas_share: -0.1
      - id: hot
        factors: { conductivity: 1.2 }
`;

describe('a fragment laid over a site file', () => {
  it('reaches the unit and the stores that it names by id, and nothing else', () => {
    const before = parseSite(text, 'config').site!.units[0]!;
    const { site, faults } = parseSite(mergeFragment(text, FRAGMENT), 'config');
    expect(faults).toBeUndefined();
    const [unit] = site!.units;
    expect(unit!.machine.work_factor).toEqual({ charge: 0.97, discharge: 1.04 });
    const [hot, cold] = unit!.stores;
    expect(hot!.bed.conductivity_factor).toBe(1.2);
    expect(hot!.bed.heat_transfer_factor).toBe(1);
    expect(hot!.gas_share).toBeUndefined();
    expect(cold!.bed.heat_transfer_factor).toBe(0.8);
    expect(cold!.gas_share).toBe(-0.1);
    expect(cold!.strings).toEqual(before.stores[1]!.strings);
    expect(unit!.channels).toEqual(before.channels);
  });

  it('tells what would be wrong with the file then', () => {
    expect(fragmentFaults(PATH, FRAGMENT)).toEqual([]);
    const [fault] = fragmentFaults(PATH, FRAGMENT.replace('0.97', '30'));
    expect(fault).toMatchObject({ path: expect.stringContaining('work_factor_charge') });
  });

  it('refuses a store that the file does not have', () => {
    expect(() => mergeFragment(text, FRAGMENT.replace('id: cold', 'id: tepid'))).toThrow('tepid');
  });
});
