import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
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
    for (let k = 0; k < 5; k++) {
      const time_ms = 30_000 * (5 * p + k);
      const indicators = viewsOf(degraded);
      events.push(
        ...stepWatch(unit, state, {
          ...{ time_ms, mode: 'charge', readingsSeen: 9, estimate: estimateOf(time_ms) },
          ...{ indicators, causes: causesOf(indicators) },
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
      /no alert of its own while this one stands: front_spread, energy_lost, /,
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
