import { describe, expect, it } from 'vitest';
import { actWords, verdictOf } from '../../../src/adapters/page/lib/verdict.js';
import type { Standing } from '../../../src/adapters/page/lib/wire.js';
import { siteVerdict } from '../../../src/adapters/page/site/siteVerdict.js';

const TIME = '2026-01-31T06:00:00.000Z';

const standing = (more: Partial<Standing>): Standing => ({
  ...{ id: 'u/valve_leaks/cold', unit: 'u', kind: 'valve_leaks', subject: 'cold' },
  ...{ class: 'alert', priority: 'medium', time: TIME, value: null, limit: null },
  ...{ message: 'It leaks.', state: 'unacknowledged', active: true, acknowledged_by: null },
  ...{
    shelved: null,
    out_of_service: null,
    cause: '',
    consequence: '',
    action: 'Lower the power.',
  },
  respond_within_h: 1,
  ...more,
});

describe('whether all is well', () => {
  it('is not known where the data are old, whatever stands', () => {
    for (const trust of ['lost', 'stale', 'empty'] as const) {
      expect(verdictOf(trust, null, [standing({ class: 'alarm' })]).level).toBe('unknown');
    }
  });

  it('begins with the worst that is new, and then with what is known', () => {
    const alert = standing({});
    const alarm = standing({ kind: 'outlet_near_limit', subject: 'hot', class: 'alarm' });
    const told = verdictOf('live', null, [alert, alarm]);
    expect(told).toEqual({
      level: 'urgent',
      words: 'Alarm: outlet near limit, hot · 1 more',
      because: 'Lower the power.',
    });
    expect(verdictOf('blind', null, [alert]).words).toBe('Blind: no readings.');
    expect(verdictOf('degraded', null, [alert]).words).toBe('Alert: valve leaks, cold');
    const seen = standing({ state: 'acknowledged' });
    expect(verdictOf('degraded', null, [seen]).level).toBe('care');
    expect(verdictOf('live', null, [seen])).toMatchObject({
      level: 'known',
      words: 'Nothing new. Known: valve leaks, cold',
    });
    expect(verdictOf('live', null, []).level).toBe('well');
  });

  it('weighs the thermocouples that are not in use although nothing stands', () => {
    const all = (count: number) => [
      { thermocouples: Array.from({ length: count }, (_, i) => ({ id: `${i}`, position_m: i })) },
    ];
    const entry = (used: number, rejected: number) =>
      ({
        definition: { stores: ['hot', 'cold'].map((id) => ({ id, strings: all(42) })) },
        state: {
          estimate: {
            time: TIME,
            stores: {
              hot: { sensors: { used, rejected: Array(rejected).fill({}) } },
              cold: { sensors: { used: 42, rejected: [] } },
            },
          },
        },
      }) as unknown as Parameters<typeof verdictOf>[1];
    expect(verdictOf('live', entry(42, 0), []).level).toBe('well');
    // One that a single scan leaves out is no verdict, and is told.
    expect(verdictOf('live', entry(41, 0), [])).toMatchObject({
      level: 'well',
      because: '83 of 84 thermocouples in use · estimate good · nothing stands',
    });
    expect(verdictOf('live', entry(41, 1), [])).toMatchObject({
      level: 'known',
      words: 'As it should be, but 1 thermocouple is left out.',
    });
    expect(verdictOf('live', entry(26, 16), [])).toMatchObject({
      level: 'care',
      because: expect.stringContaining('In use in store hot: 26 of 42.'),
    });
  });

  it('says until when to act, and how long that is by the time of the estimate', () => {
    const alarm = standing({ act_by: '2026-01-31T06:34:00.000Z' });
    expect(actWords(alarm, TIME)).toMatch(/^act by \d\d:\d\d:00, in 34 min$/);
    expect(actWords(alarm, '2026-01-31T06:35:00.000Z')).toMatch(/which is over$/);
    expect(actWords(standing({}), TIME)).toBeNull();
  });

  it('of a site counts the units, and names those that are asked about', () => {
    const well = { level: 'well', words: 'All as it should be.', because: '' } as const;
    const stale = { level: 'unknown', words: 'Not known.', because: '' } as const;
    const units = Array.from({ length: 8 }, (_, i) => ({ name: `U${i}`, ...well }));
    expect(siteVerdict(units).words).toBe('All 8 units as they should be.');
    // What is known and acknowledged is not as it should be, though it asks for nothing.
    const known = {
      level: 'known',
      words: 'Nothing new. Known: hot_axis_03',
      because: '',
    } as const;
    expect(siteVerdict(units.map((one, i) => (i < 1 ? { ...one, ...known } : one)))).toEqual({
      level: 'known',
      words: 'Nothing new. Known: 1 of 8 units; 7 as they should be.',
      because: 'U0: hot_axis_03',
    });
    expect(siteVerdict([{ name: 'U0', ...known }])).toMatchObject({ words: known.words });
    const six = units.map((one, i) => (i < 6 ? { ...one, ...stale } : one));
    expect(siteVerdict(six)).toEqual({
      level: 'unknown',
      words: 'Not known: 6 of 8 units; 2 as they should be.',
      because: 'U0: Not known. · U1: Not known. · U2: Not known. · U3: Not known. · and 2 more',
    });
  });
});
