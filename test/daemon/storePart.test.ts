import { afterEach, beforeEach, expect, it, vi } from 'vitest';
import { Counters } from '../../src/daemon/counters.js';
import { StorePart, type StorePartOptions } from '../../src/daemon/storePart.js';
import { smallSite } from './site.js';

beforeEach(() => void vi.useFakeTimers({ toFake: ['setInterval', 'clearInterval'] }));
afterEach(() => void vi.useRealTimers());

const NOW = Date.UTC(2026, 5, 1);
const DAY = 86_400_000;

/**
 * One look at a disk without enough room, with so many pieces of estimates to be thinned.
 * @returns what was thinned, with the times that ages were held against
 */
function lookedAt(clock_ms: number, newest_ms: number, pieces = 0) {
  const thinned: string[] = [];
  const counters = new Counters();
  const made = smallSite(null);
  const at = (what: string, time_ms: number) => thinned.push(`${what} ${(time_ms - NOW) / DAY}`);
  const store = new StorePart({
    // No disk has so much room.
    site: { ...made, store: { ...made.store, keep_free_MB: 10_000_000 } },
    journal: {
      emptyBytes: 0,
      seqBefore: (time_ms: number) => at('readings', time_ms),
      forget: () => 0,
    },
    history: {
      emptyBytes: 0,
      alarms: { active: () => [] },
      checkpoints: { coveredSeq: () => 0 },
      events: { add: () => true },
      write: (work: () => unknown) => work(),
      thinEarly: (now_ms: number) => {
        at('estimates', now_ms);
        // A piece may have nothing that goes, and more behind it.
        return { rows: 0, more: thinned.length < pieces };
      },
      forgetOldest: (now_ms: number) => {
        at('pictures', now_ms);
        return 0;
      },
    },
    ...{ counters, clock: { now: () => clock_ms, speed: 1 } },
    notices: { warn: (_: string, text: string) => expect(text).toBe('') },
    trouble: () => null,
    forwarded: () => Number.POSITIVE_INFINITY,
    newest_ms: () => newest_ms,
    event: () => undefined,
  } as unknown as StorePartOptions);
  store.start();
  vi.advanceTimersByTime(5000);
  store.stop();
  return thinned;
}

it('holds ages against the newest reading where the clock of this machine is years ahead', () => {
  const thinned = ['estimates 0', 'readings -2', 'pictures 0'];
  expect(lookedAt(NOW + 20 * 365 * DAY, NOW)).toEqual(thinned);
  expect(lookedAt(NOW, NOW + 1000)).toEqual(thinned);
  expect(lookedAt(NOW, Number.NEGATIVE_INFINITY)).toEqual([]);
});

it('goes on with estimates before it takes anything else, a few pieces at a look', () => {
  expect(lookedAt(NOW, NOW, 3)).toEqual([
    ...Array(3).fill('estimates 0'),
    'readings -2',
    'pictures 0',
  ]);
  expect(lookedAt(NOW, NOW, 100)).toEqual(Array(5).fill('estimates 0'));
});
