import { DateTime } from 'luxon';
import { describe, expect, it } from 'vitest';
import type { ConnectionWindow, LimitsDefinition } from '../../../src/core/definitions.js';
import { ceilingsBetween } from '../../../src/core/plan/ceilings.js';
import { unitOf } from '../track/plants.js';

const { limits: plain } = unitOf();
const ZONE = 'Europe/Berlin';
const window = (from: string, to: string): ConnectionWindow => {
  const minutes = (clock: string) => {
    const [h, m] = clock.split(':').map(Number) as [number, number];
    return h * 60 + m;
  };
  return { from_min: minutes(from), to_min: minutes(to), export_max_W: 30e3, import_max_W: 50e3 };
};
const limitsOf = (windows: ConnectionWindow[], time_zone = ZONE): LimitsDefinition => ({
  ...plain,
  connection: { time_zone, export_max_W: 90e3, import_max_W: 200e3, windows },
});

/** Times of the windows that are found over a local day, in UTC. */
function windowsOn(day: string, windows: ConnectionWindow[], zone = ZONE): string[][] {
  const from = DateTime.fromISO(day, { zone });
  const from_ms = from.toMillis();
  const to_ms = from.plus({ days: 1 }).toMillis();
  const iso = (s: number) => new Date(from_ms + s * 1000).toISOString().slice(5, 16);
  return ceilingsBetween(limitsOf(windows, zone), from_ms, to_ms)
    .filter(({ from_s }) => Number.isFinite(from_s))
    .map(({ from_s, to_s }) => [iso(from_s), iso(to_s)]);
}

describe('windows of a connection', () => {
  // The clocks go forward on 29 March 2026 at 01:00 UTC, back on 25 October 2026 at 01:00 UTC.
  it.each([
    ['a day of 24 hours', '2026-03-28', '17:00', '20:00', [['03-28T16:00', '03-28T19:00']]],
    ['a day of 23 hours', '2026-03-29', '17:00', '20:00', [['03-29T15:00', '03-29T18:00']]],
    ['a day of 25 hours', '2026-10-25', '17:00', '20:00', [['10-25T16:00', '10-25T19:00']]],
    // From 01:00 CET to 05:00 CEST are 3 hours, from 01:00 CEST to 05:00 CET are 5.
    ['the hour that is left out', '2026-03-29', '01:00', '05:00', [['03-29T00:00', '03-29T03:00']]],
    ['the hour that comes twice', '2026-10-25', '01:00', '05:00', [['10-24T23:00', '10-25T04:00']]],
    // 02:30 is never shown: the clocks pass it at 01:00 UTC, and show 03:00.
    [
      'a begin in the hour left out',
      '2026-03-29',
      '02:30',
      '04:00',
      [['03-29T01:00', '03-29T02:00']],
    ],
    [
      'an end in the hour left out',
      '2026-03-29',
      '01:00',
      '02:30',
      [['03-29T00:00', '03-29T01:00']],
    ],
    ['nothing of the hour left out', '2026-03-29', '02:15', '02:45', []],
    // 02:30 comes twice: a window opens at the first and closes at the second, so that none is missed.
    [
      'a begin in the doubled hour',
      '2026-10-25',
      '02:30',
      '04:00',
      [['10-25T00:30', '10-25T03:00']],
    ],
    [
      'an end in the doubled hour',
      '2026-10-25',
      '01:00',
      '02:30',
      [['10-24T23:00', '10-25T01:30']],
    ],
    ['the whole day by 24:00', '2026-10-25', '00:00', '24:00', [['10-24T22:00', '10-25T23:00']]],
  ] as const)('stand by the clocks on %s', (_, day, from, to, expected) => {
    expect(windowsOn(day, [window(from, to)])).toEqual(expected);
  });

  it('over midnight are those of the evening before and of this evening', () => {
    expect(windowsOn('2026-03-29', [window('22:00', '06:00')])).toEqual([
      // 22:00 CET to 06:00 CEST are 7 hours.
      ['03-28T21:00', '03-29T04:00'],
      ['03-29T20:00', '03-30T04:00'],
    ]);
    expect(windowsOn('2026-10-25', [window('22:00', '06:00')])[0]).toEqual([
      '10-24T20:00',
      '10-25T05:00',
    ]);
    expect(windowsOn('2026-01-10', [window('22:00', '00:00')])).toEqual([
      ['01-10T21:00', '01-10T23:00'],
    ]);
  });

  it('stand in the zone of the connection, where its midnight may not exist', () => {
    expect(windowsOn('2026-07-01', [window('09:00', '10:00')], 'Asia/Kolkata')).toEqual([
      ['07-01T03:30', '07-01T04:30'],
    ]);
    // In Beirut the clocks go from 00:00 to 01:00 on 29 March 2026.
    expect(windowsOn('2026-03-29', [window('00:00', '02:00')], 'Asia/Beirut')).toEqual([
      ['03-28T22:00', '03-28T23:00'],
      // What is asked about begins at 01:00 then, and so ends in the next day's window.
      ['03-29T21:00', '03-29T23:00'],
    ]);
  });

  it('cover the same time however the time asked about is cut', () => {
    const windows = [window('22:30', '02:30'), window('07:00', '09:15')];
    const from_ms = Date.UTC(2026, 9, 23);
    const hours = 96;
    const coveredAt = (t_ms: number, a_ms: number, b_ms: number) =>
      ceilingsBetween(limitsOf(windows), a_ms, b_ms).some(
        (c) =>
          Number.isFinite(c.from_s) &&
          t_ms >= a_ms + c.from_s * 1000 &&
          t_ms < a_ms + c.to_s * 1000,
      );
    const whole = ceilingsBetween(limitsOf(windows), from_ms, from_ms + hours * 3.6e6);
    for (let quarter = 0; quarter < hours * 4; quarter++) {
      const t = from_ms + quarter * 900_000;
      const expected = whole.some(
        ({ from_s, to_s }) =>
          Number.isFinite(from_s) && quarter * 900 >= from_s && quarter * 900 < to_s,
      );
      expect(coveredAt(t, t, t + 900_000), new Date(t).toISOString()).toBe(expected);
      // And by the clocks, but in the doubled hour.
      const { hour, minute, day } = DateTime.fromMillis(t, { zone: ZONE });
      if (day === 25 && hour === 2) continue;
      const clock = hour * 60 + minute;
      expect(expected).toBe(clock >= 1350 || clock < 150 || (clock >= 420 && clock < 555));
    }
  });
});

describe('ceilings', () => {
  it('have the limits of the connection all the time, and those of outages that touch it', () => {
    const from_ms = Date.UTC(2026, 0, 1);
    const outage = (from_h: number, to_h: number, reason: string) => ({
      from_ms: from_ms + from_h * 3.6e6,
      to_ms: from_ms + to_h * 3.6e6,
      ...{ discharge_max_W: 0, charge_max_W: 40e3, reason },
    });
    const outages = [outage(-3, 0, 'over'), outage(-2, 1, 'stands'), outage(24, 30, 'later')];
    const found = ceilingsBetween({ ...limitsOf([]), outages }, from_ms, from_ms + 24 * 3.6e6);
    expect(found).toEqual([
      { from_s: -7200, to_s: 3600, charge_max_W: 40e3, discharge_max_W: 0, cause: 'outage' },
      {
        ...{ from_s: Number.NEGATIVE_INFINITY, to_s: Number.POSITIVE_INFINITY },
        ...{ charge_max_W: 200e3, discharge_max_W: 90e3, cause: 'connection' },
      },
    ]);
    expect(ceilingsBetween(plain, from_ms, from_ms + 3.6e6)).toEqual([]);
  });
});
