import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { Mode } from '../../../src/core/definitions.js';
import { type DoneRow, GAP_MS } from '../../../src/core/plan/discharges.js';
import { DoneSeries } from '../../../src/core/plan/doneSeries.js';

const MINUTE = 60_000;
const MODES: (Mode | null)[] = ['stand', 'charge', 'discharge', null];

const scan = fc.record({
  step: fc.constantFrom(MINUTE, 5 * MINUTE, GAP_MS, GAP_MS + 1),
  mode: fc.constantFrom(...MODES),
  given_MW_el: fc.constantFrom(0, 0.9, 1, 1.2, Number.NaN),
});

const scans = fc.array(scan, { maxLength: 30 }).map((steps): DoneRow[] => {
  let time_ms = 0;
  return steps.map(({ step, ...row }) => {
    time_ms += step;
    const unknown = { flow_kg_s: 0, hot_degC: Number.NaN, cold_degC: Number.NaN };
    return { time_ms, ...row, ...unknown };
  });
});

const times = fc.tuple(fc.integer({ min: 0, max: 200 }), fc.integer({ min: 0, max: 200 }));

describe('scans summed up', () => {
  it('tell of any time what going through its scans does', () => {
    fc.assert(
      fc.property(scans, times, (rows, minutes) => {
        const [from, to] = minutes.map((n) => n * MINUTE).sort((a, b) => a - b) as [number, number];
        const done = new DoneSeries(rows);
        const own = rows.filter((row) => row.time_ms >= from && row.time_ms <= to);
        expect(done.scans(from, to)).toBe(own.length);
        expect(done.stood(from, to)).toBe(own.filter((row) => row.mode === 'stand').length);
        const leg = { mode: 'charge' as const, power_W: 1e6, from_ms: from, to_ms: to };
        const ran = own.filter((row) => row.mode === 'charge' && row.given_MW_el >= 0.9);
        const expected = ran.filter((row) => row.given_MW_el <= 1.1).length;
        // The second time from what is known.
        for (let i = 0; i < 2; i++) expect(done.ran(leg, from, to)).toBe(expected);
        const marks = [from, ...own.map((row) => row.time_ms), to];
        const inner = marks.filter((t, i) => i === 0 || i === marks.length - 1 || t < to);
        const whole = inner.every((t, i) => i === 0 || t - (inner[i - 1] as number) <= GAP_MS);
        expect(done.isWhole(from, to)).toBe(whole);
      }),
      { seed: 7, numRuns: 300 },
    );
  });

  it('have no last scan where there are none', () => {
    expect(new DoneSeries([]).last_ms).toBe(Number.NEGATIVE_INFINITY);
    expect(new DoneSeries([]).isWhole(0, GAP_MS + 1)).toBe(false);
  });
});
