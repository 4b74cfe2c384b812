import { describe, expect, it } from 'vitest';
import type { CycleScan } from '../../../src/core/watch/cycle/cycleScan.js';
import { HEAT_PER_DRAWN, HEAT_PER_GIVEN, type Part, run, script, unread } from './cycleScript.js';

const HALF: Part = { mode: 'stand', scans: 30 };
const charge = (scans: number): Part => ({ mode: 'charge', scans });
const discharge = (scans: number): Part => ({ mode: 'discharge', scans });
/** Of the scripted machine. */
const TRUE = HEAT_PER_DRAWN / HEAT_PER_GIVEN;
/** The edge of a run is known to half a scan of a hundred or more, and the auxiliaries count. */
const WITHIN = 0.012;

function tripsOf(parts: readonly Part[], change?: (scan: CycleScan, i: number) => CycleScan) {
  const scans = script(parts, change ? { change } : {});
  return run(scans).records.filter(({ kind }) => kind === 'discharge');
}

describe('round trip', () => {
  it('of a whole cycle: what was given over what was drawn since the stores were as full', () => {
    // 240 scans up by 0.25 % each, and down again by 0.4 %.
    const [one] = tripsOf([HALF, charge(240), HALF, discharge(150), HALF]);
    expect(one!.round_trip).toBeGreaterThan(TRUE - WITHIN);
    expect(one!.round_trip).toBeLessThan(TRUE);
    expect(one!.round_trip_over!.delivered_MWh_el).toBeCloseTo(5, 1);
    expect(Object.values(one!.round_trip_over!.soc_left).map(Math.abs)).toEqual([
      expect.closeTo(0, 6),
      expect.closeTo(0, 6),
    ]);
  });

  it('of a part: counted from within the charge, where the stores were as full as at the end', () => {
    const [one] = tripsOf([HALF, charge(240), HALF, discharge(75), HALF]);
    // Down by 30 %: half the charge and half its electricity.
    expect(one!.round_trip_over!.drawn_MWh_el).toBeCloseTo(4, 1);
    expect(Math.abs(one!.round_trip! - TRUE)).toBeLessThan(WITHIN);
    const middle = script([HALF, charge(240)])[30 + 120]!.time_ms;
    expect(Math.abs(Date.parse(one!.round_trip_over!.from) - middle)).toBeLessThan(2 * 60_000);
  });

  it('of a discharge in two parts: the second counts all since the stores were as empty', () => {
    const [first, second] = tripsOf([
      HALF,
      charge(240),
      HALF,
      discharge(75),
      HALF,
      discharge(75),
      HALF,
    ]);
    expect(Math.abs(first!.round_trip! - TRUE)).toBeLessThan(WITHIN);
    expect(Math.abs(second!.round_trip! - TRUE)).toBeLessThan(WITHIN);
    expect(second!.round_trip_over!.delivered_MWh_el).toBeCloseTo(5, 1);
  });

  it('of cycles within a cycle', () => {
    const trips = tripsOf([
      ...[HALF, charge(200), HALF, discharge(50), HALF, charge(80), HALF, discharge(50)],
      ...[HALF, charge(40), HALF, discharge(110), HALF],
    ]);
    expect(trips).toHaveLength(3);
    for (const trip of trips) expect(Math.abs(trip.round_trip! - TRUE)).toBeLessThan(WITHIN);
  });

  it('counts what was lost while it stood', () => {
    // A tenth of what is stored goes while it stands.
    const [one] = tripsOf([HALF, charge(240), HALF, discharge(120), HALF], (scan, i) => {
      const lost = 0.06 * Math.min(1, Math.max(0, (i - 270) / 30));
      const stores = scan.stores.map((store) => ({ ...store, soc: store.soc - lost }));
      return { ...scan, stores };
    });
    // 60 % came in for 8 MWh; 54 % went out again, 48 % of them as electricity: as empty at 16 %.
    const expected = (120 * 2) / (8 * 60 * (0.54 / 0.6));
    expect(Math.abs(one!.round_trip! - expected)).toBeLessThan(WITHIN);
    expect(one!.round_trip!).toBeLessThan(TRUE - 0.05);
  });

  it('of a discharge that went lower than ever: the charge is extended in proportion', () => {
    const [one] = tripsOf([HALF, charge(240), HALF, discharge(158), HALF]);
    expect(Math.abs(one!.round_trip! - TRUE)).toBeLessThan(WITHIN);
    expect(one!.round_trip_over!.soc_left.hot).toBeCloseTo(-0.032, 2);
    // Much lower: how the electricity came in that is given now was not seen.
    const [far] = tripsOf([HALF, charge(240), HALF, discharge(170), HALF]);
    expect(far!.round_trip).toBeNull();
    expect(far!.round_trip_over).toBeNull();
  });

  it('is not told of a little, of stores that differ, nor over a gap', () => {
    const cycle = [HALF, charge(240), HALF, discharge(150), HALF];
    expect(tripsOf([HALF, charge(240), HALF, discharge(20), HALF])[0]!.round_trip).toBeNull();
    const apart = tripsOf(cycle, (scan, i) => ({
      ...scan,
      stores: scan.stores.map((store, s) => ({
        ...store,
        soc: store.soc + (s === 0 ? 1 : -1) * 0.06 * (i > 270 ? 1 : 0),
      })),
    }));
    expect(apart[0]!.round_trip).toBeNull();
    const gap = tripsOf(cycle, (scan, i) => (i > 100 && i < 112 ? unread(scan) : scan));
    expect(gap[0]!.round_trip).toBeNull();
    const dark = tripsOf(cycle, (scan) => ({ ...scan, power_MW: Number.NaN }));
    expect(dark[0]!.round_trip).toBeNull();
  });
});
