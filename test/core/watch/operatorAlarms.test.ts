import { describe, expect, it } from 'vitest';
import type { Mode } from '../../../src/core/definitions.js';
import type { Quality } from '../../../src/core/estimate.js';
import { ALARM_TEXTS } from '../../../src/core/watch/alarmTexts.js';
import { EVENT_KINDS, type WatchEvent } from '../../../src/core/watch/event.js';
import { KIND_CLASSES } from '../../../src/core/watch/kinds.js';
import { startWatch, stepWatch } from '../../../src/core/watch/watch.js';
import { estimateOf, unitOf } from './units.js';

interface Scan {
  readonly mode?: Mode;
  readonly drop_Pa?: number | null;
  readonly quality?: Quality;
}

/** Scans of 30 s of a unit that allows 2 kPa; lists `second id transition`. */
function run(scans: readonly Scan[]): { short: string[]; events: WatchEvent[] } {
  const plain = unitOf();
  const unit = unitOf({ limits: { ...plain.limits, pressure_drop_max_Pa: 2000 } });
  const state = startWatch();
  const events = scans.flatMap(({ mode = 'discharge', drop_Pa, quality = 'good' }, k) => {
    const time_ms = 30_000 * k;
    const drops_Pa = drop_Pa === undefined ? {} : { hot: drop_Pa };
    const estimate = { ...estimateOf(time_ms), quality };
    return stepWatch(unit, state, {
      ...{ time_ms, mode, estimate, spread: {}, readingsSeen: 9, drops_Pa },
    });
  });
  const short = events.map((e) => `${Date.parse(e.time) / 1000} ${e.id} ${e.transition}`);
  return { short, events };
}
const times = (n: number, scan: Scan) => Array.from({ length: n }, () => scan);

describe('a pressure drop near its limit', () => {
  it('is an alarm of the store within a tenth of the limit, either way of the flow, after a minute', () => {
    const { short, events } = run([
      ...times(3, { drop_Pa: 1790 }),
      ...times(4, { drop_Pa: -1850, mode: 'charge' }),
      // Inside the deadband it stays.
      ...times(5, { drop_Pa: 1750 }),
      ...times(4, { drop_Pa: 1690 }),
    ]);
    expect(short).toEqual([
      '150 one/pressure_drop_near_limit/hot raised',
      '420 one/pressure_drop_near_limit/hot returned',
    ]);
    expect(events[0]).toMatchObject({ class: 'alarm', priority: 'high', value: 1850, limit: 1800 });
    expect(events[0]!.message).toContain('1.85 kPa, 93 % of the greatest allowed 2.00 kPa');
  });

  it('returns where the unit stands, and neither comes nor goes by a missing reading', () => {
    const { short } = run([
      ...times(4, { drop_Pa: 1900 }),
      ...times(9, { drop_Pa: null }),
      ...times(4, { drop_Pa: 1900, mode: 'stand' }),
    ]);
    expect(short.map((line) => line.split(' ')[2])).toEqual(['raised', 'returned']);
    expect(run(times(9, { drop_Pa: null })).short).toEqual([]);
    expect(run(times(9, {})).short).toEqual([]);
  });
});

describe('an estimate that is no guide', () => {
  it.each(['blind', 'stale'] as const)('%s is an alarm while discharging alone', (quality) => {
    const { short, events } = run([
      ...times(3, {}),
      ...times(20, { quality, mode: 'charge' }),
      ...times(20, { quality, mode: 'stand' }),
      ...times(7, { quality }),
      ...times(4, {}),
    ]);
    const begin = 43 * 30;
    expect(short).toEqual([
      `${begin + 180} one/estimate_blind/one raised`,
      `${begin + 270} one/estimate_blind/one returned`,
    ]);
    expect(events[0]!.message).toContain(`its estimate is ${quality}`);
  });

  it('is not raised by two minutes of doubt', () => {
    expect(run([...times(5, { quality: 'blind' }), ...times(9, {})]).short).toEqual([]);
  });
});

describe('texts of alarms and alerts', () => {
  it('say cause, consequence and action of every kind, and alarms can be answered within the hour', () => {
    expect(Object.keys(ALARM_TEXTS).sort()).toEqual([...EVENT_KINDS].sort());
    for (const kind of EVENT_KINDS) {
      const { cause, consequence, action, respond_within_h } = ALARM_TEXTS[kind];
      for (const text of [cause, consequence, action]) expect(text).toMatch(/^[A-Z].{10,}[.]$/);
      const isAlarm = KIND_CLASSES[kind].class === 'alarm';
      expect(respond_within_h > 0 && respond_within_h <= 1, kind).toBe(isAlarm);
    }
  });
});
