import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { RejectedSensor, SensorVerdict } from '../../../src/core/estimate.js';
import { causesOf } from '../../../src/core/watch/causes.js';
import { CAUSES } from '../../../src/core/watch/causeTable.js';
import { MAY_FOLLOW } from '../../../src/core/watch/consequences.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import {
  INDICATOR_KINDS,
  type IndicatorKind,
  type IndicatorView,
} from '../../../src/core/watch/indicator.js';
import { INDICATOR_EVENTS } from '../../../src/core/watch/kinds.js';
import { startWatch, stepWatch } from '../../../src/core/watch/watch.js';
import { estimateOf, unitOf } from './units.js';

const UNIT_KINDS: readonly IndicatorKind[] = ['gas_inventory', 'store_mismatch', 'energy_lost'];
const MARKS = INDICATOR_KINDS.flatMap((kind) =>
  UNIT_KINDS.includes(kind) ? [`${kind} one`] : [`${kind} hot`, `${kind} cold`],
);

/** All indicators of a unit, those named ("kind subject") degraded. */
function viewsOf(degraded: readonly string[]): IndicatorView[] {
  return MARKS.map((mark) => {
    const [kind, subject] = mark.split(' ') as [IndicatorKind, string];
    const bad = degraded.includes(mark);
    return {
      ...{ kind, subject, unit: '-', value: bad ? 3 : 1, sigma: 0.1, limit: 2, deadband: 0.1 },
      ...{ healthy: 1, healthy_from: 'learned', state: bad ? 'degraded' : 'normal', reason: null },
      ...{ on_delay_s: 60, off_delay_s: 60, score: bad ? 1 : 0, time: null },
      sentence: `${mark} is ${bad ? 'bad' : 'sound'}.`,
    } as IndicatorView;
  });
}

/** Raised and returned, [second, kind subject transition], over five scans of each phase. */
function run(...phases: readonly (readonly string[])[]) {
  const unit = unitOf();
  const state = startWatch();
  const events: WatchEvent[] = [];
  phases.forEach((degraded, p) => {
    const indicators = viewsOf(degraded);
    const causes = causesOf(indicators);
    for (let k = 0; k < 5; k++) {
      const time_ms = 30_000 * (5 * p + k);
      events.push(
        ...stepWatch(unit, state, {
          ...{ time_ms, mode: 'charge', readingsSeen: 9, estimate: estimateOf(time_ms) },
          ...{ indicators, causes },
        }),
      );
    }
  });
  const short = events.map((e) => `${e.kind} ${e.subject} ${e.transition}`);
  return { events, short };
}

describe('what only follows from a cause that is told', () => {
  const dust = ['heat_transfer cold', 'spread_ratio cold', 'energy_lost one', 'front_view cold'];

  it('has no alert of its own, and is named in that of the cause', () => {
    const { events, short } = run(dust.slice(0, 1), dust, dust);
    expect(short).toEqual(['heat_transfer_low cold raised']);
    expect(events[0]!.message).toContain(CAUSES.dust_or_fines.words);
    expect(events[0]!.message).toMatch(
      /no alert of its own while this one stands: front spread, energy lost, /,
    );
    // Also where all is decided within the same scan.
    expect(run(dust).short).toEqual(['heat_transfer_low cold raised']);
  });

  it('keeps the alert that it had before, until it is healthy', () => {
    expect(run(['spread_ratio cold'], dust, ['heat_transfer cold']).short).toEqual([
      'front_spread cold raised',
      'heat_transfer_low cold raised',
      'front_spread cold returned',
    ]);
  });

  it('is raised once the alert of its cause is gone', () => {
    expect(run(dust, dust, ['spread_ratio cold'], ['spread_ratio cold']).short).toEqual([
      'heat_transfer_low cold raised',
      'heat_transfer_low cold returned',
      'front_spread cold raised',
    ]);
  });

  it('is raised in a store that the cause is not in, and where nothing tells of its cause', () => {
    expect(run(['heat_transfer cold', 'spread_ratio hot']).short.sort()).toEqual([
      'front_spread hot raised',
      'heat_transfer_low cold raised',
    ]);
    expect(run(['energy_lost one']).short).toEqual(['energy_lost one raised']);
  });

  it('never hides a second fault, nor leaves what is degraded without an alert', () => {
    fc.assert(
      fc.property(fc.subarray(MARKS), fc.subarray(MARKS), (before, now) => {
        const { events } = run(before, now, now);
        const standing = new Set<string>();
        for (const { kind, subject, transition } of events) {
          if (transition === 'raised') standing.add(`${kind} ${subject}`);
          else standing.delete(`${kind} ${subject}`);
        }
        const told = now.filter(
          (mark) => INDICATOR_EVENTS[mark.split(' ')[0] as IndicatorKind] !== undefined,
        );
        if (told.length > 0) expect(standing.size).toBeGreaterThan(0);
        for (const mark of told) {
          const [kind, subject] = mark.split(' ') as [IndicatorKind, string];
          if (!MAY_FOLLOW.has(kind))
            expect(standing).toContain(`${INDICATOR_EVENTS[kind]} ${subject}`);
        }
      }),
      { seed: 21, numRuns: 200 },
    );
  });
});

const DAY_S = 86_400;

/** A scan an hour of views made of what is degraded, each mark with value and sigma. */
interface Part {
  readonly hours: number;
  readonly off: Readonly<Record<string, readonly [value: number, sigma: number]>>;
  /** Of the hot store. */
  readonly rejected?: readonly RejectedSensor[];
}

function follow(parts: readonly Part[]): { short: string[]; events: WatchEvent[] } {
  const unit = { ...unitOf(), scan_period_s: 3600 };
  const state = startWatch();
  const events: WatchEvent[] = [];
  let hour = 0;
  for (const { hours, off, rejected = [] } of parts) {
    const indicators = viewsOf(Object.keys(off)).map((view) => {
      const told = off[`${view.kind} ${view.subject}`];
      if (view.kind === 'pressure_drop' || view.kind === 'front_travel')
        return { ...view, limit: 1.15, ...(told ? { value: told[0], sigma: told[1] } : {}) };
      return told ? { ...view, value: told[0], sigma: told[1] } : view;
    });
    const causes = causesOf(indicators);
    for (let k = 0; k < hours; k++, hour++) {
      const time_ms = 3_600_000 * hour;
      const hot = { sensors: { used: 3, rejected: [...rejected] } };
      const estimate = estimateOf(time_ms, hot);
      const input = { time_ms, mode: 'charge' as const, readingsSeen: 9, estimate };
      events.push(...stepWatch(unit, state, { ...input, indicators, causes }));
    }
  }
  const short = events.map(
    (e) => `${Date.parse(e.time) / 3.6e6} ${e.kind} ${e.subject} ${e.transition}`,
  );
  return { short, events };
}

describe('pressure drops that are high by a flow meter', () => {
  const drops = { 'pressure_drop hot': [1.13, 0.03], 'pressure_drop cold': [1.14, 0.03] } as const;
  const travels = {
    'front_travel hot': [1.075, 0.01],
    'front_travel cold': [1.076, 0.01],
  } as const;

  it('wait for the travel of the fronts, and have no alert once it tells of the meter', () => {
    const { short, events } = follow([
      { hours: 10, off: drops },
      { hours: 30, off: { ...drops, ...travels } },
    ]);
    expect(short.sort()).toEqual([
      '11 front_travel_off cold raised',
      '11 front_travel_off hot raised',
    ]);
    expect(events[0]!.message).toMatch(/no alert of its own .*pressure drop high/);
  });

  it('are told after a day where nothing tells', () => {
    expect(follow([{ hours: 30, off: drops }]).short).toEqual([
      `${DAY_S / 3600} pressure_drop_high hot raised`,
      `${DAY_S / 3600} pressure_drop_high cold raised`,
    ]);
  });

  it('told before it are withdrawn, with the reason', () => {
    // One store alone was off at first.
    const { short, events } = follow([
      { hours: 5, off: { 'pressure_drop hot': [1.16, 0.03] } },
      { hours: 10, off: { ...drops, ...travels } },
    ]);
    expect(short).toEqual([
      '1 pressure_drop_high hot raised',
      '6 front_travel_off hot raised',
      '6 front_travel_off cold raised',
      '6 pressure_drop_high hot returned',
    ]);
    expect(events.at(-1)!.message).toMatch(/^Withdrawn: .* flow meter/);
  });

  it('are told where one is higher than the meter makes it, or in one store alone', () => {
    const dusty = { ...drops, ...travels, 'pressure_drop cold': [1.5, 0.03] } as const;
    expect(follow([{ hours: 5, off: dusty }]).short.filter((s) => s.includes('drop'))).toEqual([
      '1 pressure_drop_high hot raised',
      '1 pressure_drop_high cold raised',
    ]);
    expect(follow([{ hours: 5, off: { 'pressure_drop cold': [1.2, 0.03] } }]).short).toEqual([
      '1 pressure_drop_high cold raised',
    ]);
  });
});

describe('thermocouples that hang in gas over a settled bed', () => {
  const rejected = (id: string, verdict: SensorVerdict): RejectedSensor => {
    return { id, verdict, since: '2026-01-01T00:00:00Z', evidence: '' };
  };
  // At 0.2, 0.6 and 1 m from the top.
  const settled = { 'settling hot': [0.2, 0.1] } as const;

  it('have no finding of their own, and one told before is withdrawn', () => {
    const bare = [rejected('hot_a_1', 'offset')];
    expect(follow([{ hours: 9, off: settled, rejected: bare }]).short).toEqual([
      '1 bed_settled hot raised',
    ]);
    const { short, events } = follow([
      { hours: 3, off: {}, rejected: bare },
      { hours: 9, off: settled, rejected: bare },
    ]);
    expect(short).toEqual([
      '1 sensor_rejected hot_a_1 raised',
      '4 bed_settled hot raised',
      '5 sensor_rejected hot_a_1 returned',
    ]);
    expect(events[2]!.message).toMatch(/still left out, as it hangs in gas over the settled bed/);
  });

  it('are told where they are broken, or lie deeper, and again once the bed is refilled', () => {
    for (const other of [rejected('hot_a_1', 'open'), rejected('hot_a_2', 'offset')]) {
      const { short } = follow([{ hours: 9, off: settled, rejected: [other] }]);
      expect(short).toContain(`1 sensor_rejected ${other.id} raised`);
      expect(short).toHaveLength(2);
    }
    const bare = [rejected('hot_a_1', 'drifting')];
    const { short } = follow([
      { hours: 5, off: settled, rejected: bare },
      { hours: 5, off: {}, rejected: bare },
    ]);
    expect(short).toEqual([
      '1 bed_settled hot raised',
      '6 sensor_rejected hot_a_1 raised',
      '6 bed_settled hot returned',
    ]);
  });
});
