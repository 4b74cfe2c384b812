import fc from 'fast-check';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import type { JournalReading } from '../../../src/adapters/history/journal.js';
import { PERIOD_MS, smallUnit } from '../site.js';
import { Rig, reading } from './rig.js';

const START = Date.UTC(2026, 0, 5, 6);
const SCANS = 60;
let rig: Rig;
beforeAll(async () => {
  // One plant with a unit for each course of events: they share journal and history.
  const units = Array.from({ length: 100 }, (_, i) => smallUnit(`u${i}`));
  rig = await new Rig({ units }).start();
});
afterAll(() => rig.stop());

/** Half an hour: a, b and c in each scan, now and then e, which reports by exception. */
function course(unit: string): JournalReading[] {
  const readings = Array.from({ length: SCANS }, (_, i) => {
    const at = (ms: number) => START + i * PERIOD_MS + ms;
    return [
      reading('a', at(100), 300 + i * 0.1),
      reading('b', at(200), 310 + Math.sin(i)),
      ...(i % 5 === 2 ? [reading('e', at(250), i)] : []),
      reading('c', at(300), 320 + i / 3),
      ...(i % 7 === 3 ? [reading('e', at(20_000), -i)] : []),
    ];
  }).flat();
  return readings.map((one) => ({ ...one, unit }));
}

/** What a state is, but for what only says which readings closed it. */
function stateOf(unit: string): unknown {
  const image = rig.runners.get(unit)!.checkpoint()?.image as {
    unit: unknown;
    assembler: { next: number; newest_ms: number; hold: unknown; slots: unknown };
    standing: unknown;
  };
  const { next, newest_ms, hold, slots } = image.assembler;
  return { unit: image.unit, standing: image.standing, next, newest_ms, hold, slots };
}

const bare = (unit: string) =>
  rig.estimates(unit).map(({ revision: _, dispatch: __, unit: ___, ...rest }) => rest);
const span = [START, START + SCANS * PERIOD_MS] as const;
const means = (unit: string) =>
  rig.history.estimates.series(unit, ...span, 4, ['state_of_charge', 'quality']).points;

describe('readings that come hours late', () => {
  it('leave the state, the estimates and the roll-ups as if all had come in time', async () => {
    let units = 0;
    await rig.take(course('u0'));
    const all = course('u0');
    const later = fc.record({
      // Minutes by which a reading is late, too many for an open scan. No state is from before the
      // first scan, and of the last ones nothing is late.
      delays: fc.array(
        fc.oneof({ weight: 3, arbitrary: fc.constant(0) }, fc.integer({ min: 3, max: 40 })),
        {
          minLength: all.length,
          maxLength: all.length,
        },
      ),
      settles: fc.array(fc.integer({ min: 1, max: SCANS + 80 }), { maxLength: 3 }),
    });
    await fc.assert(
      fc.asyncProperty(later, async ({ delays, settles }) => {
        const unit = `u${++units}`;
        const sent = course(unit)
          .map((one, i) => {
            const scan = Math.floor((one.time_ms - START) / PERIOD_MS);
            const late_ms = scan === 0 || scan > SCANS - 4 ? 0 : delays[i]! * 60_000;
            return { ...one, arrival_ms: one.time_ms + late_ms };
          })
          .sort((a, b) => a.arrival_ms - b.arrival_ms);
        for (let from = 0, scan = 4; from < sent.length; scan += 4) {
          const now = START + scan * PERIOD_MS;
          const reached = sent.findIndex(({ arrival_ms }) => arrival_ms >= now);
          const to = reached < 0 ? sent.length : reached;
          await rig.take(sent.slice(from, to));
          from = to;
          // The clock closes what is past its deadline, whatever is missing.
          const over = Math.min(START + SCANS * PERIOD_MS, now - 10_000);
          rig.journal.appendClose(unit, Math.floor(over / PERIOD_MS) - 1, now);
          if (settles.some((at) => at >= scan - 4 && at < scan)) await rig.settle(unit);
        }
        await rig.settle(unit);
        expect(stateOf(unit)).toEqual(stateOf('u0'));
        expect(bare(unit)).toEqual(bare('u0'));
        expect(means(unit)).toEqual(means('u0'));
      }),
      { numRuns: 6, seed: 4 },
    );
    expect(rig.counters.get('rewinds')).toBeGreaterThan(6);
    expect(rig.counters.get('late_lost') + rig.counters.get('too_late')).toBe(0);
  });
});
