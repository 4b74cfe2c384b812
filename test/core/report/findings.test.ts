import { describe, expect, it } from 'vitest';
import { findingsOf } from '../../../src/core/report/findings.js';
import { cycleTotals, median } from '../../../src/core/report/totals.js';
import { causesOf } from '../../../src/core/watch/causes.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import { cycles, FROM, indicator, report } from '../../adapters/report/reportPlant.js';

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
    expect(first?.text).toContain(bad.sentence);
    // It stands in the text: the evidence has what else speaks for or against it.
    expect(first?.evidence.some((line) => line.includes(bad.sentence))).toBe(false);
    expect(first?.check).toContain('filters');
    expect(findingsOf(data).some(({ title }) => title.startsWith('Nothing'))).toBe(false);
  });

  it('call a cause probable only where it is, else name what has changed', () => {
    const bad = indicator({});
    const [cause] = causesOf([bad]);
    const unsure = { ...cause!, probability: 0.053 };
    const [first] = findingsOf(report({ indicators: [bad], causes: [unsure] }));
    expect(first?.title).toBe('Heat transfer: no cause is probable by itself');
    expect(first?.title).not.toContain('probably');
    expect(first?.evidence[0]).toBe(
      'Likeliest, of what would show here: dust or fines in the bed (5.3 %).',
    );
  });

  it('leave no degraded indicator out where no cause was named', () => {
    const data = report({ indicators: [indicator({ subject: 'hot' })] });
    expect(findingsOf(data)[0]).toMatchObject({ level: 'act', subject: 'hot', check: null });
  });

  const event = (hour: number, part: Partial<WatchEvent> = {}): WatchEvent => ({
    ...{ id: 'u/heat_transfer_low/cold', unit: 'u', kind: 'heat_transfer_low', class: 'alert' },
    ...{ priority: 'medium', subject: 'cold', transition: 'raised', value: 0.3, limit: 0.7 },
    ...{ time: new Date(FROM + hour * 3_600_000).toISOString(), message: `told at ${hour}` },
    ...part,
  });

  it('tell what was degraded within the span, though it no longer is at its end', () => {
    const events = [event(10), event(20, { transition: 'returned' }), event(30)];
    const returned = event(40, { transition: 'returned' });
    const [first] = findingsOf(report({ events: [...events, returned] }));
    expect(first).toMatchObject({ level: 'watch', subject: 'cold', evidence: ['told at 30'] });
    expect(first?.title).toBe(
      'Heat transfer low: was so from 2026-01-01 10:00 to 2026-01-02 16:00, not at the end of the span',
    );
    expect(first?.text).toContain('2 times');
    // What stood at the beginning and returned, or was lost with a restart.
    const standing = [{ kind: 'heat_transfer', subject: 'cold' }] as const;
    const early = findingsOf(report({ events: [returned], degraded_at_start: standing }));
    expect(early[0]?.title).toContain('was so from 2026-01-01 00:00 to 2026-01-02 16:00');
    expect(findingsOf(report({ degraded_at_start: standing }))[0]?.level).toBe('watch');
    // Still so at the end: the finding to act on alone. Other events are no degradation.
    const still = findingsOf(report({ events, indicators: [indicator({})] }));
    expect(still.filter(({ title }) => title.includes('was so'))).toEqual([]);
    const other = event(1, { kind: 'data_stale', id: 'u/data_stale/u' });
    expect(findingsOf(report({ events: [other] }))[0]?.level).toBe('note');
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
    expect(told[2]?.title).toBe('1 of 2 indicators are undecided');
    expect(told[2]?.text).toContain('1 cannot be told with these instruments');
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
        ...{ longest_gap_h: 3, missing_h: 5, thinned_before: '2026-01-02T00:00:00.000Z' },
        thinned_to_s: 600,
      },
      cycles: cycles(6, { incomplete: ['gap'] }),
    });
    const titles = findingsOf(data).map(({ title }) => title);
    expect(titles).toEqual(
      expect.arrayContaining([
        'Readings are missing',
        'Not all estimates are good',
        'Runs that are incomplete',
        'Older times are kept thinned',
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
