import { describe, expect, it } from 'vitest';
import { loadSite } from '../../../src/config/load.js';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import {
  implausibleReadings,
  plausibleRanges,
  touchesEstimate,
  withoutImplausible,
} from '../../../src/core/track/plausible.js';

const unit = loadSite('config/demo.yaml').units[0] as UnitDefinition;
const at = (kind: string, store: string) =>
  unit.channels.findIndex(
    ({ role }) => role.kind === kind && 'store' in role && role.store === store,
  );

function scanOf(readings: readonly (readonly [number, number])[]) {
  const values = new Float64Array(unit.channels.length).fill(Number.NaN);
  for (const [i, value] of readings) values[i] = value;
  return { time_ms: 0, values, held: new Uint8Array(values.length) };
}

describe('pressures that no plant produces', () => {
  const [hot, cold] = [at('pressure', 'hot'), at('pressure', 'cold')];
  const [hotDrop, coldDrop] = [at('pressure_drop', 'hot'), at('pressure_drop', 'cold')];

  it('are missing ones, counted by kind, and do not make the estimate worse', () => {
    const { scan, dropped } = withoutImplausible(
      plausibleRanges(unit),
      scanOf([
        [hot, -9999e5],
        [cold, 1e9],
        [hotDrop, 1e300],
        [coldDrop, -4.7e8],
      ]),
    );
    expect(scan.values.every(Number.isNaN)).toBe(true);
    expect(
      implausibleReadings(unit, dropped)
        .map(({ kind }) => kind)
        .sort(),
    ).toEqual([...['pressure', 'pressure', 'pressure_drop', 'pressure_drop']]);
    expect(touchesEstimate(unit, dropped)).toBe(false);
    const flow = unit.channels.findIndex(({ role }) => role.kind === 'flow');
    expect(touchesEstimate(unit, [...dropped, flow])).toBe(true);
  });

  it('are not those of a plant that is let down, beyond its limit, or flows the other way', () => {
    const { dropped } = withoutImplausible(
      plausibleRanges(unit),
      scanOf([
        [hot, 0],
        [cold, 2 * 1.04e5],
        [hotDrop, -4000],
        [coldDrop, 9000],
      ]),
    );
    expect(dropped).toEqual([]);
  });
});
