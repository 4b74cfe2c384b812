import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type DoneRow, dischargesIn } from '../../../src/core/plan/discharges.js';
import { offerReport, type PastOffer, wilson } from '../../../src/core/plan/offerReport.js';
import { H, unit } from './offerUnit.js';

const MINUTE_MS = 60_000;
const HOUR_MS = H * 1000;
/** Hot outlet at its limit [degC]. */
const LIMIT = (unit.limits.hot_outlet_min_K as number) - 273.15;

/** Scans of a minute: stands, discharges at 60 kW from `from_h` to `to_h`, stands. */
function story({
  from_h = 4,
  to_h = 8,
  power_MW = 0.06,
  last_degC = LIMIT,
  until_h = 10,
  flow_kg_s = 1,
  before = 'stand' as DoneRow['mode'],
} = {}): DoneRow[] {
  return Array.from({ length: until_h * 60 }, (_, i): DoneRow => {
    const h = i / 60;
    const runs = h >= from_h && h < to_h;
    // Falls by 40 K in the last hour.
    const hot_degC = last_degC + Math.min(60, 40 * Math.max(0, to_h - h));
    return {
      time_ms: i * MINUTE_MS,
      mode: runs ? 'discharge' : h < from_h ? before : 'stand',
      given_MW_el: runs ? power_MW : -0.0003,
      flow_kg_s: runs ? flow_kg_s : 0,
      hot_degC: runs ? hot_degC : Number.NaN,
      cold_degC: runs ? -129 : Number.NaN,
    };
  });
}

function offer(over: Partial<PastOffer> = {}): PastOffer {
  return {
    ...{ no: 1, asked_ms: HOUR_MS, power_MW_el: 0.06, begins_ms: 4 * HOUR_MS, refused: false },
    energy_MWh_el: { p90: 0.23, p50: 0.245, p10: 0.26 },
    legs: [],
    ...over,
  };
}

function whyNot(rows: readonly DoneRow[], past: PastOffer): string | undefined {
  const { tested, untested } = offerReport(unit, [past], rows);
  expect(tested).toHaveLength(0);
  return Object.entries(untested).find(([, count]) => count === 1)?.[0];
}

describe('discharges among stored scans', () => {
  it('have the energy of their power, their median power and the rule that ended them', () => {
    const [run, ...others] = dischargesIn(unit, story());
    expect(others).toEqual([]);
    // Four hours, half a scan lost or won at each end.
    expect(run!.energy_MWh_el).toBeCloseTo(4 * 0.06, 3);
    expect(run).toMatchObject({ power_MW_el: 0.06, ended_by: 'hot_outlet', whole: true });
    expect(dischargesIn(unit, story({ last_degC: LIMIT + 50 }))[0]!.ended_by).toBeNull();
    const fast = story({ last_degC: LIMIT + 50, flow_kg_s: unit.limits.discharge.flow_max_kg_s });
    expect(dischargesIn(unit, fast)[0]!.ended_by).toBe('flow');
  });
});

describe('the report of past offers', () => {
  it('counts what was kept where the unit did what the offer told by', () => {
    const report = offerReport(unit, [offer()], story());
    expect(report.tested).toHaveLength(1);
    expect(report.tested[0]).toMatchObject({
      ...{ no: 1, ended_by: 'hot_outlet', kept: { p90: true, p50: false } },
    });
    expect(report.p90).toMatchObject({ kept: 1, of: 1, share: 1, meant: 0.9 });
    expect(report.p50).toMatchObject({ kept: 0, of: 1, share: 0 });
    expect(Object.values(report.untested).every((count) => count === 0)).toBe(true);
  });

  it('counts the others as not put to the test, each for its reason', () => {
    expect(whyNot(story(), offer({ refused: true }))).toBe('refused');
    expect(whyNot(story(), offer({ begins_ms: 5 * HOUR_MS }))).toBe('not_run');
    expect(whyNot(story(), offer({ power_MW_el: 0.07 }))).toBe('other_power');
    expect(whyNot(story({ last_degC: LIMIT + 50 }), offer())).toBe('stopped_before_a_rule');
    expect(whyNot(story({ until_h: 7 }), offer())).toBe('not_yet');
    expect(whyNot(story(), offer({ begins_ms: 12 * HOUR_MS }))).toBe('not_yet');
    expect(whyNot(story({ before: 'charge' }), offer())).toBe('plan_not_followed');
    const gap = story().filter((row) => row.time_ms < 5 * HOUR_MS || row.time_ms > 6 * HOUR_MS);
    expect(whyNot(gap, offer())).toBe('readings_missing');
    const early = story().filter((row) => row.time_ms < 2 * HOUR_MS || row.time_ms > 3 * HOUR_MS);
    expect(whyNot(early, offer())).toBe('readings_missing');
  });

  it('takes the plan for what was to be done until then', () => {
    const charging = story({ before: 'charge' }).map((row) =>
      row.mode === 'charge' ? { ...row, given_MW_el: -0.1 } : row,
    );
    const leg = { mode: 'charge' as const, power_W: 0.1e6, from_ms: 0, to_ms: 4 * HOUR_MS };
    expect(offerReport(unit, [offer({ legs: [leg] })], charging).tested).toHaveLength(1);
    const less = { ...leg, power_W: 0.15e6 };
    expect(whyNot(charging, offer({ legs: [less] }))).toBe('plan_not_followed');
  });

  it('counts one discharge once: the last asked before it', () => {
    const first = offer({ no: 1, asked_ms: HOUR_MS, energy_MWh_el: { p90: 1, p50: 1, p10: 1 } });
    const last = offer({ no: 2, asked_ms: 2 * HOUR_MS });
    const report = offerReport(unit, [last, first], story());
    expect(report.tested.map((one) => one.no)).toEqual([2]);
    expect(report.untested.superseded).toBe(1);
  });
});

describe('the interval of a share', () => {
  it('is that of the published example, and always holds the share', () => {
    // Newcombe 1998, Stat. Med. 17, 857, table I: 81 of 263, score method: 0.2553 to 0.3662.
    const [low, high] = wilson(81, 263);
    expect(low).toBeCloseTo(0.2553, 4);
    expect(high).toBeCloseTo(0.3662, 4);
    fc.assert(
      fc.property(fc.nat(300), fc.nat(300), (a, b) => {
        const of = Math.max(a, b, 1);
        const kept = Math.min(a, b);
        const [from, to] = wilson(kept, of);
        expect(from).toBeLessThanOrEqual(kept / of + 1e-12);
        expect(to).toBeGreaterThanOrEqual(kept / of - 1e-12);
        expect(from).toBeGreaterThanOrEqual(0);
        expect(to).toBeLessThanOrEqual(1);
      }),
      { seed: 4 },
    );
  });
});
