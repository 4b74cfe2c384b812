import { describe, expect, it } from 'vitest';
import type { ChannelDefinition, Mode } from '../../../src/core/definitions.js';
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
  readonly readingsSeen?: number;
}

const CHANNEL = {
  ...{ id: 'drop_hot', format: { kind: 'value' }, reporting: { kind: 'periodic' } },
  role: { kind: 'pressure_drop', store: 'hot' },
} as unknown as ChannelDefinition;

/** Scans of 30 s of a unit that allows 2 kPa; lists `second id transition`. */
function run(scans: readonly Scan[]): { short: string[]; events: WatchEvent[] } {
  const plain = unitOf();
  const unit = unitOf({
    limits: { ...plain.limits, pressure_drop_max_Pa: 2000 },
    channels: [CHANNEL],
  });
  const state = startWatch();
  const events = scans.flatMap((scan, k) => {
    const { mode = 'discharge', drop_Pa, quality = 'good', readingsSeen = 9 } = scan;
    const time_ms = 30_000 * k;
    const drops_Pa = drop_Pa === undefined ? {} : { hot: drop_Pa };
    const estimate = { ...estimateOf(time_ms), quality };
    return stepWatch(unit, state, {
      ...{ time_ms, mode, estimate, spread: {}, readingsSeen, drops_Pa },
    });
  });
  const short = events.map((e) => `${Date.parse(e.time) / 1000} ${e.id} ${e.transition}`);
  return { short, events };
}
const times = (n: number, scan: Scan) => Array.from({ length: n }, () => scan);

describe('a pressure drop near its limit', () => {
  it('is an alarm of the store within a tenth of the limit, in either mode, after a minute', () => {
    const { short, events } = run([
      ...times(3, { drop_Pa: 1790 }),
      ...times(4, { drop_Pa: 1850, mode: 'charge' }),
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
    expect(events[1]!.message).toBe('Store hot: its pressure drop is away from its limit again.');
  });

  it('returns where the unit stands, and neither comes nor goes by a missing reading', () => {
    const { short, events } = run([
      ...times(4, { drop_Pa: 1900 }),
      ...times(2, { drop_Pa: null }),
      ...times(4, { drop_Pa: 1900, mode: 'stand' }),
    ]);
    expect(events[1]!.message).toContain('the unit stands');
    expect(short.map((line) => line.split(' ')[2])).toEqual(['raised', 'returned']);
    expect(run(times(9, { drop_Pa: null })).short).toEqual([]);
    expect(run(times(9, {})).short).toEqual([]);
  });

  it('returns as no longer to be judged once its channel has been dead for ten minutes', () => {
    const { short, events } = run([
      ...times(4, { drop_Pa: 1900 }),
      ...times(30, { drop_Pa: null }),
      ...times(5, { drop_Pa: 1900 }),
    ]);
    expect(short).toEqual([
      '60 one/pressure_drop_near_limit/hot raised',
      '180 one/sensor_rejected/drop_hot raised',
      '750 one/pressure_drop_near_limit/hot returned',
      '1080 one/pressure_drop_near_limit/hot raised',
      '1080 one/sensor_rejected/drop_hot returned',
    ]);
    expect(events[1]).toMatchObject({ class: 'alert', value: null });
    expect(events[1]!.message).toContain('gives no reading');
    expect(events[2]!.message).toContain('can no longer be judged');
  });

  it.each([
    ['negative', -1850, 'reads below zero while gas flows'],
    ['far beyond', 12_000, 'several times what may ever be'],
  ])('is no alarm where the reading is %s, but a finding of its transmitter', (_, bad, words) => {
    const { short, events } = run([
      ...times(2, { drop_Pa: 900 }),
      ...times(9, { drop_Pa: bad }),
      ...times(9, { drop_Pa: 0, mode: 'stand' }),
      ...times(4, { drop_Pa: 900 }),
    ]);
    expect(short).toEqual([
      '120 one/sensor_rejected/drop_hot raised',
      '660 one/sensor_rejected/drop_hot returned',
    ]);
    expect(events[0]).toMatchObject({ class: 'alert', value: bad });
    expect(events[0]!.message).toContain(words);
  });

  it('has no finding of a zero that is a little off, nor while no reading comes of anything', () => {
    expect(run(times(9, { drop_Pa: -80 })).short).toEqual([]);
    expect(run(times(9, { drop_Pa: -1850, mode: 'stand' })).short).toEqual([]);
    const silent = times(40, { drop_Pa: null, readingsSeen: 0, mode: 'charge' });
    expect(run([{ drop_Pa: 900 }, ...silent]).short).toEqual(['180 one/data_stale/one raised']);
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
    expect(events[1]!.message).toBe('Unit one: its estimate is a guide again.');
    const ended = run([...times(8, { quality }), ...times(4, { quality, mode: 'stand' })]);
    expect(ended.events[1]!.message).toBe('Unit one: the discharge has ended; it stands.');
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
