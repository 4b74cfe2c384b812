import { describe, expect, it } from 'vitest';
import {
  beginMargin,
  firstMinutes,
  LACK_TOLD,
  lackBetween,
  lackOf,
  leastMargin,
  type StartMargin,
  startMargin,
  toldBelow,
  untoldLack,
} from '../../../src/core/dispatch/firstMinutes.js';

const POWER = 1e6;
const margins: StartMargin[] = [
  { t_s: 0, margin_W: -200e3 },
  { t_s: 60, margin_W: -50e3 },
  { t_s: 120, margin_W: 50e3 },
  { t_s: 180, margin_W: 100e3 },
];

describe('what is missing in the first minutes', () => {
  it('is the area under the power asked, by straight lines, until the power is had', () => {
    // A trapezium of 60 s and a triangle of 30 s.
    const area = (60 * (200e3 + 50e3)) / 2 + (30 * 50e3) / 2;
    expect(lackOf(margins)).toEqual({ most_W: 200e3, until_s: 90, energy_J: area });
  });

  it('adds up over spans of time, also where a span is cut within a line', () => {
    const whole = lackBetween(margins, -30e3, 0, 180);
    const parts = [0, 7, 61, 100, 131, 180]
      .slice(1)
      .reduce(
        ([sum, from], to) => [sum + lackBetween(margins, -30e3, from, to), to] as [number, number],
        [0, 0] as [number, number],
      )[0];
    expect(parts).toBeCloseTo(whole, 3);
    expect(lackBetween(margins, 0, 180, 900)).toBe(0);
  });

  it('is the sum of many thin slices', () => {
    let sum = 0;
    const n = 18_000;
    for (let i = 0; i < n; i++) {
      const t = ((i + 0.5) * 180) / n;
      const a = margins[Math.min(2, Math.floor(t / 60))] as StartMargin;
      const b = margins[Math.min(2, Math.floor(t / 60)) + 1] as StartMargin;
      const m = a.margin_W + ((b.margin_W - a.margin_W) * (t - a.t_s)) / 60 - 40e3;
      sum += Math.max(0, -m) * (180 / n);
    }
    // Midpoints of slices of 10 ms: exact but for the slice of the zero, 2.5 kW/s x (5 ms)^2.
    expect(Math.abs(lackBetween(margins, -40e3, 0, 180) - sum)).toBeLessThan(1);
  });

  it('is nothing where the margin never falls below 0', () => {
    expect(lackOf(margins, 200e3)).toEqual({ most_W: 0, until_s: 0, energy_J: 0 });
  });

  it('counts from 0.5 % of the energy of a quarter of an hour on', () => {
    const told = toldBelow(margins, POWER);
    const missing = lackBetween(margins, told - leastMargin(margins), 0, 1e9);
    expect(missing / (LACK_TOLD * POWER * 900)).toBeCloseTo(1, 4);
    expect(untoldLack(POWER)).toBe(LACK_TOLD * POWER * 900);
  });

  it('lets a run begin whatever is missing at first, if nothing is after', () => {
    const last = margins.at(-1)?.margin_W as number;
    expect(beginMargin(margins)).toBe(last);
    expect(beginMargin([{ t_s: -1, margin_W: -POWER }, ...margins])).toBe(last);
    expect(beginMargin([...margins, { t_s: 240, margin_W: -1 }])).toBe(-1);
    expect(beginMargin([])).toBe(Number.POSITIVE_INFINITY);
  });

  it('takes a machine that could only draw for one that gives nothing', () => {
    expect(startMargin(3, -5e5, POWER)).toEqual({ t_s: 3, margin_W: -POWER });
    expect(startMargin(3, 2 * POWER, POWER).margin_W).toBe(POWER);
  });

  it('is told with its probability, and with more missing for the plants that are worse', () => {
    const sure = firstMinutes(margins, POWER, 0);
    expect(sure?.told).toMatchObject({ probability: 1, lacking_MW: 0.2, minutes: 1.5 });
    expect(sure?.told.lacking_at_worst_MW).toBe(0.2);
    const unsure = firstMinutes(margins, POWER, 100e3);
    expect(unsure?.told.lacking_at_worst_MW).toBeCloseTo(0.2 + 0.128155, 5);
    const { p90, p50, p10 } = unsure?.missing_J ?? { p90: 0, p50: 0, p10: 0 };
    expect(p90).toBeGreaterThan(p50);
    expect(p50).toBeGreaterThan(p10);
    // Half of all plants lie below the least margin that counts, where that is the likeliest.
    const even = margins.map(({ t_s, margin_W }) => ({
      t_s,
      margin_W: margin_W + toldBelow(margins, POWER) + 200e3,
    }));
    expect(firstMinutes(even, POWER, 100e3)?.told.probability).toBeCloseTo(0.5, 3);
  });

  it('is not told where it is improbable, nor where the power is not had later either', () => {
    const high = margins.map(({ t_s, margin_W }) => ({ t_s, margin_W: margin_W + 400e3 }));
    expect(firstMinutes(high, POWER, 50e3)).toBeNull();
    expect(firstMinutes(margins.slice(0, 2), POWER, 50e3)).toBeNull();
    expect(firstMinutes([], POWER, 50e3)).toBeNull();
  });
});
