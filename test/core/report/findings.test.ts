import { describe, expect, it } from 'vitest';
import { findingsOf } from '../../../src/core/report/findings.js';
import { cycleTotals, median } from '../../../src/core/report/totals.js';
import { causesOf } from '../../../src/core/watch/causes.js';
import { cycles, indicator, report } from '../../adapters/report/reportPlant.js';

describe('findings', () => {
  it('say that nothing was found where nothing was', () => {
    const [first, ...others] = findingsOf(report());
    expect(first).toMatchObject({ level: 'note', title: 'Nothing that needs attention was found' });
    expect(others).toEqual([]);
  });

  it('begin with what is degraded, its probable cause, the evidence and what to check', () => {
    const bad = indicator({});
    const data = report({ indicators: [bad], causes: causesOf([bad]) });
    const [first] = findingsOf(data);
    expect(first).toMatchObject({ level: 'act', subject: 'cold' });
    expect(first?.title).toMatch(/^dust or fines in the bed, probably/);
    expect(first?.evidence.some((line) => line.includes(bad.sentence))).toBe(true);
    expect(first?.check).toContain('filters');
    expect(findingsOf(data).some(({ title }) => title.startsWith('Nothing'))).toBe(false);
  });

  it('leave no degraded indicator out where no cause was named', () => {
    const data = report({ indicators: [indicator({ subject: 'hot' })] });
    expect(findingsOf(data)[0]).toMatchObject({ level: 'act', subject: 'hot', check: null });
  });

  it('tell sensors, tests under way, and what the instruments cannot tell', () => {
    const base = report();
    const [first, ...rest] = base.sensors;
    const now = { id: first!.id, verdict: 'stuck', since: base.from, evidence: 'e' } as const;
    const data = report({
      sensors: [{ ...first!, now }, ...rest],
      indicators: [
        indicator({ state: 'normal', score: 0.6 }),
        indicator({ kind: 'standing_loss', state: 'undetermined', reason: 'not_instrumented' }),
      ],
    });
    const told = findingsOf(data);
    expect(told.map(({ level }) => level)).toEqual(['watch', 'watch', 'note']);
    expect(told[0]?.title).toBe('1 of 4 thermocouples are not believed');
    expect(told[1]?.title).toContain('60 % of the way');
    expect(told[2]?.title).toBe('What these instruments cannot tell');
  });

  it('see a round trip that falls over the span, but not one that scatters', () => {
    const falling = cycles(54).map((c, i) =>
      c.round_trip === null ? c : { ...c, round_trip: 0.55 - 0.001 * i },
    );
    const level = (data: typeof falling) =>
      findingsOf(report({ cycles: data })).some(
        ({ title }) => title === 'The round trip has fallen',
      );
    expect(level(falling)).toBe(true);
    expect(
      level(
        cycles(54).map((c, i) =>
          c.round_trip === null ? c : { ...c, round_trip: 0.5 + 0.01 * (i % 2) },
        ),
      ),
    ).toBe(false);
    expect(level(falling.slice(0, 9))).toBe(false);
  });

  it('note missing readings, poor estimates and incomplete runs', () => {
    const data = report({
      readings: {
        scans: 100,
        quality: { good: 80, degraded: 15, blind: 3, stale: 2 },
        ...{ longest_gap_h: 3, missing_h: 5 },
      },
      cycles: cycles(6, { incomplete: ['gap'] }),
    });
    const titles = findingsOf(data).map(({ title }) => title);
    expect(titles).toEqual(
      expect.arrayContaining([
        'Readings are missing',
        'Not all estimates are good',
        'Runs that are incomplete',
      ]),
    );
  });
});

describe('totals', () => {
  it('are the sums of the runs, with what is unknown counted', () => {
    const list = cycles(9);
    list[0] = { ...list[0]!, drawn_MWh_el: null };
    expect(cycleTotals(list)).toEqual({
      ...{ charges: 3, discharges: 3, stands: 3, incomplete: 0, drawn_MWh_el: 24 },
      ...{ delivered_MWh_el: 18, unknown: 1, round_trip: 0.5, round_trips: 3, standing_h: 18 },
      standing_lost_MWh_th: { hot: expect.closeTo(0.6, 12), cold: expect.closeTo(0.6, 12) },
    });
  });

  it('take the middle', () => {
    expect([median([]), median([3, 1, 2]), median([4, 1, 2, 3])]).toEqual([null, 2, 2.5]);
  });
});
