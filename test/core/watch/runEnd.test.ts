import { describe, expect, it } from 'vitest';
import type { Mode } from '../../../src/core/definitions.js';
import type { EndCause, Quality } from '../../../src/core/estimate.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import { isOutletNear } from '../../../src/core/watch/outletAlarm.js';
import { clock } from '../../../src/core/watch/outletWords.js';
import { type Forecast, type RunEndState, stepRunEnd } from '../../../src/core/watch/runEnd.js';
import { startWatch, stepWatch } from '../../../src/core/watch/watch.js';
import { estimateOf, unitOf } from './units.js';

const MIN = 60_000;

/**
 * A store of so many MWh, which a discharge at P takes P / efficiency from: at 1 MW one MWh an hour, at
 * less power somewhat less. What is left may be other than what was thought, from a time on.
 */
interface Course {
  readonly minutes: number;
  readonly power_MW?: number;
  readonly mode?: Mode;
  readonly quality?: Quality;
  /** Correction of what is thought to be left, at the beginning of this part [MWh]. */
  readonly found_MWh?: number;
  readonly margin_K?: number;
}

const drawOf = (power_MW: number) => power_MW * (0.8 + 0.2 * power_MW);

function run(
  left_MWh: number,
  courses: readonly Course[],
  ends_by: EndCause = 'hot_outlet',
): { events: WatchEvent[]; short: string[]; asked: string[] } {
  const plain = unitOf();
  const unit = unitOf({ limits: { ...plain.limits, connection: zoned() } });
  const state = startWatch();
  const asked: string[] = [];
  const events: WatchEvent[] = [];
  let run: RunEndState | undefined;
  let left = left_MWh;
  let time_ms = 0;
  for (const course of courses) {
    const { minutes, power_MW = 1, mode = 'discharge', quality = 'good', margin_K = 60 } = course;
    left += course.found_MWh ?? 0;
    for (let k = 0; k < 2 * minutes; k++) {
      if (mode === 'discharge') left = Math.max(0, left - drawOf(power_MW) / 120);
      const hours = (power_W: number) => left / drawOf(power_W / 1e6);
      const forecast: Forecast = {
        hours: (power_W) => {
          asked.push(`told ${time_ms / MIN}`);
          return { p50: hours(power_W), p90: 0.98 * hours(power_W) };
        },
        central: (power_W) => {
          asked.push(`central ${time_ms / MIN}`);
          return { hours: hours(power_W), ends_by };
        },
      };
      const estimate = { ...estimateOf(time_ms, { outlet_K: 673.15 + margin_K }), quality };
      run = stepRunEnd(
        run,
        {
          ...{ time_ms, mode, quality, power_W: -1e6 * power_MW, roughly_h: hours(1e6) },
          isNear: isOutletNear(unit, estimate),
          isAlarmed: state.conditions['outlet_near_limit/hot']?.raised ?? false,
        },
        forecast,
      );
      const input = { time_ms, mode, readingsSeen: 9, estimate, run };
      events.push(...stepWatch(unit, state, input));
      time_ms += MIN / 2;
    }
  }
  const short = events.map(
    (e) => `${Date.parse(e.time) / MIN} ${e.subject} ${e.transition} ${e.priority}`,
  );
  return { events, short, asked };
}

function zoned() {
  return { time_zone: 'Europe/Berlin' } as NonNullable<
    ReturnType<typeof unitOf>['limits']['connection']
  >;
}

describe('a discharge that runs to its end', () => {
  it('as told is no alarm, however near its outlet comes to the limit', () => {
    const parts = [{ minutes: 180 }, { minutes: 55, margin_K: 10 }, { minutes: 5, margin_K: 1 }];
    expect(run(4, [...parts, { minutes: 20, mode: 'stand' }]).short).toEqual([]);
  });

  it('is looked at anew every five minutes in the last hour and a half only', () => {
    const { asked } = run(4, [{ minutes: 180 }]);
    expect(asked[0]).toBe('told 2');
    expect(asked[1]).toBe('central 149.5');
    expect(asked.slice(1).map((text) => text.split(' ')[0])).toEqual(Array(7).fill('central'));
  });

  it('earlier than told is an alarm within the hour, until when by the clock of the plant', () => {
    const { events, short } = run(6, [
      { minutes: 120 },
      { minutes: 179, found_MWh: -1 },
      { minutes: 10, mode: 'stand' },
    ]);
    // Told for 06:00, found by 02:00 that it will be 05:00; an hour before, and its delay.
    expect(short).toEqual(['240.5 hot raised high', '300 hot returned high']);
    const [raised, returned] = events;
    expect(raised!.act_by).toBe('1970-01-01T04:59:30.000Z');
    expect(raised!.message).toContain(
      'at 1.00 MW the discharge ends at 06:00, by the outlet of the hot store, 60 min earlier than was ' +
        'told at 01:02 (07:00, firmly 06:52)',
    );
    expect(raised!.message).toContain('Until 06:00: lower the power or prepare the change-over');
    expect(raised!.message).toContain('some 1.0 MWh will be missing');
    expect(returned!.message).toBe('Store hot: the discharge has ended; the unit stands.');
  });

  it('is of medium priority where half an hour is lost and there is time, high where it hurries', () => {
    expect(run(4, [{ minutes: 100 }, { minutes: 100, found_MWh: -0.5 }]).short).toEqual([
      '150.5 hot raised medium',
    ]);
    expect(run(4, [{ minutes: 180 }, { minutes: 30, found_MWh: -0.8 }]).short).toEqual([
      // The rollout of five minutes, and the delay.
      '185.5 hot raised high',
    ]);
  });

  it('that is found to end within five minutes is no alarm: nobody could act on it', () => {
    // Found half a minute before a look, of some 61 minutes: that 4 are left, then that 12 are.
    const short = (minutes: number) =>
      run(4, [{ minutes: 179 }, { minutes, found_MWh: (minutes - 61) / 60 }]);
    expect(short(4).short).toEqual([]);
    const [raised] = short(12).events;
    expect(raised).toMatchObject({ kind: 'outlet_near_limit', priority: 'high' });
    expect(Date.parse(raised!.act_by!) - Date.parse(raised!.time)).toBeGreaterThanOrEqual(5 * MIN);
    // One that stands by then goes on standing until the run is over.
    const whole = run(6, [
      { minutes: 120 },
      { minutes: 179, found_MWh: -1 },
      { minutes: 9, margin_K: 3 },
      { minutes: 10, mode: 'stand' },
    ]);
    expect(whole.short.map((line) => line.split(' ')[2])).toEqual(['raised', 'returned']);
    // An outlet past its limit asks for an end now.
    const past = run(4, [{ minutes: 180 }, { minutes: 4, found_MWh: -0.93, margin_K: -6 }]);
    expect(past.events[0]!.message).toContain('End the discharge or lower the power now');
  });

  it('less than a quarter of an hour earlier, or still after the firm end, is none', () => {
    expect(run(2, [{ minutes: 30 }, { minutes: 90, found_MWh: -0.2 }]).short).toEqual([]);
    expect(run(20, [{ minutes: 30 }, { minutes: 1160, found_MWh: -0.3 }]).short).toEqual([]);
  });

  it('keeps what was told when the power changes, by what is left at either', () => {
    // Found 1 MWh short at full power, then half of it: still that much earlier, so still an alarm.
    const parts = [{ minutes: 60 }, { minutes: 60, found_MWh: -1 }];
    expect(run(5, [...parts, { minutes: 250, power_MW: 0.5 }]).short).toHaveLength(1);
    // A change of power alone is none.
    expect(run(5, [{ minutes: 60 }, { minutes: 500, power_MW: 0.5 }]).short).toEqual([]);
  });

  it('returns once the operator has lowered the power, with the end as told then', () => {
    const { events, short } = run(5, [
      { minutes: 60 },
      { minutes: 130, found_MWh: -1 },
      { minutes: 30, power_MW: 0.4 },
    ]);
    expect(short.map((line) => line.split(' ')[2])).toEqual(['raised', 'returned']);
    expect(events[1]!.message).toMatch(
      /at 0\.40 MW the discharge lasts until 0\d:\d\d, as is told/,
    );
  });

  it('is of the store nearest to its limit where no outlet ends it', () => {
    const early = [{ minutes: 60 }, { minutes: 130, found_MWh: -1 }];
    const { events } = run(5, early, 'flow');
    expect(events[0]).toMatchObject({ subject: 'hot' });
    expect(events[0]!.message).toContain('as the greatest flow no longer gives this power');
    expect(run(5, early, 'cold_outlet').events[0]).toMatchObject({ subject: 'cold' });
  });
});

describe('an outlet', () => {
  it('past its limit while the unit still discharges is an alarm, told or not', () => {
    const { events, short } = run(4, [{ minutes: 60 }, { minutes: 5, margin_K: -6 }]);
    expect(short).toEqual(['61 hot raised high']);
    expect(events[0]!.message).toMatch(/6\.0 K past the limit .* still discharges\. End/);
    expect(events[0]).toMatchObject({ act_by: events[0]!.time, limit: 0 });
  });

  it('near its limit is one where nothing was told for want of an estimate, by nearness alone', () => {
    const { events, short } = run(4, [
      { minutes: 60, quality: 'blind' },
      { minutes: 10, power_MW: Number.NaN, margin_K: 10 },
    ]);
    const outlets = events.filter(({ kind }) => kind === 'outlet_near_limit');
    expect(short.at(-1)).toBe('61 hot raised high');
    expect(outlets[0]!.message).toMatch(/Of this discharge no end was told before/);
    expect(outlets[0]!.act_by).toBeUndefined();
  });

  it('says nothing while the estimate is no guide', () => {
    const { events } = run(4, [{ minutes: 60 }, { minutes: 60, quality: 'blind', margin_K: 3 }]);
    expect(events.map(({ kind }) => kind)).toEqual(['estimate_blind']);
  });
});

describe('a time to act', () => {
  it('is written by the clock of the zone, UTC without one', () => {
    const ms = Date.parse('2026-07-01T01:39:40Z');
    expect(clock('Europe/Berlin', ms)).toBe('03:40');
    expect(clock(null, ms)).toBe('01:40 UTC');
  });
});
