import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { heldByDesign } from '../../../src/core/alarm/byDesign.js';
import { type Annunciation, alarmFigures } from '../../../src/core/alarm/figures.js';
import { countFloods } from '../../../src/core/alarm/flood.js';

const MIN = 60_000;
const DAY = 1440 * MIN;
const at = (id: string, ...minutes: number[]): Annunciation[] =>
  minutes.map((minute) => ({ id, time_ms: minute * MIN, priority: 'high' }));
const inOrder = (all: Annunciation[]) => [...all].sort((a, b) => a.time_ms - b.time_ms);

describe('a flood', () => {
  it('begins with the eleventh alarm in ten minutes, not the tenth', () => {
    const spaced = (n: number) => Array.from({ length: n }, (_, i) => i * 50_000);
    expect(countFloods(spaced(10), 0, DAY).floods).toEqual([]);
    expect(countFloods(spaced(10), 0, DAY).most).toBe(10);
    // The eleventh comes 500 s after the first.
    const { floods, most } = countFloods(spaced(11), 0, DAY);
    expect(most).toBe(11);
    // Below five once the fifth last of 11, the seventh at 300 s, is ten minutes old.
    expect(floods).toEqual([{ from_ms: 0, to_ms: 900_000, count: 11, most_in_10_min: 11 }]);
    // An alarm every 61 s never has more than ten in ten minutes.
    const slow = Array.from({ length: 500 }, (_, i) => i * 61_000);
    expect(countFloods(slow, 0, DAY).floods).toEqual([]);
  });

  it('goes on at five in ten minutes and is open where the span ends in it', () => {
    const begin = Array.from({ length: 11 }, (_, i) => i * 1000);
    const on = Array.from({ length: 20 }, (_, i) => (i + 1) * 119_000);
    const { floods, in_flood_ms } = countFloods([...begin, ...on], 0, 40 * MIN);
    expect(floods).toMatchObject([{ from_ms: 0, to_ms: null, count: 31 }]);
    expect(in_flood_ms).toBe(40 * MIN);
  });

  it('is what a count at every second says, for drawn alarms', () => {
    fc.assert(
      fc.property(fc.array(fc.integer({ min: 0, max: 4000 }), { maxLength: 120 }), (drawn) => {
        const seconds = drawn.sort((a, b) => a - b);
        const until = 4600;
        let flooded = 0;
        let isFlood = false;
        let most = 0;
        const begins: number[] = [];
        for (let now = 0; now < until; now++) {
          const count = seconds.filter((t) => t <= now && now - t < 600).length;
          most = Math.max(most, count);
          if (isFlood && count < 5) isFlood = false;
          else if (!isFlood && count > 10) {
            isFlood = true;
            begins.push(seconds.find((t) => now - t < 600)!);
          }
          if (isFlood) flooded++;
        }
        const found = countFloods(
          seconds.map((t) => 1000 * t),
          0,
          until * 1000,
        );
        expect(found.most).toBe(most);
        expect(found.floods.map(({ from_ms }) => from_ms / 1000)).toEqual(begins);
        // A flood is dated back to the first alarm of its first ten minutes.
        expect(found.in_flood_ms / 1000).toBeGreaterThanOrEqual(flooded);
        expect(found.in_flood_ms / 1000).toBeLessThanOrEqual(flooded + 600 * begins.length);
      }),
      { seed: 5, numRuns: 60 },
    );
  });
});

describe('figures of an alarm system', () => {
  const input = (
    annunciations: Annunciation[],
    standing: { id: string; since_ms: number }[] = [],
  ) =>
    alarmFigures({ from_ms: 0, to_ms: 2 * DAY, annunciations: inOrder(annunciations), standing });

  it('count rates over the span', () => {
    const figures = input([...at('a', 5, 700, 2000), ...at('b', 9)]);
    expect(figures).toMatchObject({ annunciated: 4, per_day: 2, most_in_10_min: 2, floods: [] });
    expect(figures.per_10_min).toBeCloseTo(4 / 288, 12);
    expect(figures.by_priority).toEqual({ high: 1, medium: 0, low: 0 });
  });

  it('leave out what came before the span, which still counts for its first ten minutes', () => {
    const early = at('a', ...Array.from({ length: 11 }, (_, i) => i / 2 - 6));
    const figures = input(early);
    expect(figures.annunciated).toBe(0);
    expect(figures.floods).toHaveLength(1);
    expect(figures.share_in_flood).toBeGreaterThan(0);
  });

  it('name what chatters: the same alarm three times within a minute, not three alarms', () => {
    const figures = input([
      ...at('a', 1, 1.5, 2),
      ...at('b', 1, 2, 3),
      ...at('c', 1),
      ...at('d', 1),
    ]);
    expect(figures.chattering).toEqual([{ id: 'a', most_in_a_minute: 3 }]);
  });

  it('name what stands longer than a day, the oldest first', () => {
    const since = (hours: number) => 2 * DAY - hours * 60 * MIN;
    const standing = [25, 24, 40].map((hours) => ({ id: `h${hours}`, since_ms: since(hours) }));
    expect(input([], standing).stale).toEqual([
      { id: 'h40', hours: 40 },
      { id: 'h25', hours: 25 },
    ]);
  });

  it('list the ten most frequent and their share of all', () => {
    const all = Array.from({ length: 12 }, (_, k) =>
      at(`k${String(k).padStart(2, '0')}`, ...Array.from({ length: k + 1 }, (_, i) => 30 * i)),
    ).flat();
    const { most_frequent, share_of_most_frequent } = input(all);
    expect(most_frequent).toHaveLength(10);
    expect(most_frequent[0]).toEqual({ id: 'k11', count: 12, share: 12 / 78 });
    expect(share_of_most_frequent).toBeCloseTo((78 - 3) / 78, 12);
    expect(input([])).toMatchObject({ share_of_most_frequent: null, by_priority: null });
  });

  it('refuse a span that is none', () => {
    const none = { from_ms: 1, to_ms: 1, annunciations: [], standing: [] };
    expect(() => alarmFigures(none)).toThrow(/must end after it begins, got 1 to 1/);
    expect(() => countFloods([2, 1], 0, 9)).toThrow(/times must ascend, got 1 after 2/);
  });
});

describe('suppression by design', () => {
  it('holds back by mode what comes up under it, and never what is shown already', () => {
    expect(heldByDesign('outlet_near_limit', 'stand', true)).toBe(false);
    expect(heldByDesign('outlet_near_limit', 'stand', false)).toBe(true);
    expect(heldByDesign('outlet_near_limit', 'charge', false)).toBe(true);
    expect(heldByDesign('outlet_near_limit', 'discharge', true)).toBe(false);
    expect(heldByDesign('pressure_drop_near_limit', 'charge', true)).toBe(false);
    expect(heldByDesign('string_flow_uneven', 'stand', false)).toBe(true);
    expect(heldByDesign('string_flow_uneven', 'stand', true)).toBe(false);
    expect(heldByDesign('standing_loss_high', 'stand', false)).toBe(false);
    expect(heldByDesign('outlet_near_limit', null, false)).toBe(false);
  });
});
