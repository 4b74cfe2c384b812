import { join } from 'node:path';
import { afterEach, beforeEach, expect, it, vi } from 'vitest';
import { Journal } from '../../src/adapters/history/journal.js';
import { Counters } from '../../src/daemon/counters.js';
import { Housekeeping, type HousekeepingOptions } from '../../src/daemon/housekeeping.js';
import { temporaryFolder } from '../support/folders.js';
import { smallSite } from './site.js';

beforeEach(() => void vi.useFakeTimers({ toFake: ['setTimeout', 'setInterval', 'clearTimeout'] }));
afterEach(() => void vi.useRealTimers());

const NOW = Date.UTC(2026, 5, 1);
const DAY = 86_400_000;
const HOUR = 3_600_000;

/** Two hours of housekeeping over a journal of so many entries of 40 days ago and one of now. */
function kept(entries: number, clock_ms: number) {
  const journal = new Journal(join(temporaryFolder('housekeeping'), 'journal.sqlite'));
  journal.start();
  const of = (time_ms: number) =>
    ({ unit: 'u', channel: 'a', time_ms, arrival_ms: time_ms, value: 1, quality: 'good' }) as const;
  journal.append(Array.from({ length: entries }, (_, i) => of(NOW - 40 * DAY + i)));
  journal.append([of(NOW)]);
  const retained: number[] = [];
  let thinned = 0;
  const counters = new Counters();
  const counts = { estimates: 0, offers: 0, not_forwarded: 0 };
  const housekeeping = new Housekeeping({
    ...{ site: smallSite(null), journal, counters, poll_ms: 1000, steps: null },
    clock: { now: () => clock_ms, speed: 1 },
    history: {
      retain: (now_ms: number) => retained.push(now_ms) && counts,
      rollUp: () => false,
      thin: () => ({ rows: 10, more: ++thinned < 7 }),
      checkpoints: { coveredSeq: () => journal.lastSeq },
    },
    pipeline: { closeDue: () => undefined },
    rewinder: { poll: () => undefined, forgetOld: () => undefined },
    notices: { warn: (_: string, text: string) => expect(text).toBe('') },
    forwarded: () => Number.POSITIVE_INFINITY,
    newest_ms: () => NOW,
  } as unknown as HousekeepingOptions);
  housekeeping.start();
  vi.advanceTimersByTime(1.5 * HOUR);
  housekeeping.stop();
  const [oldest] = journal.read(0, 1);
  const left = journal.lastSeq - oldest!.seq + 1;
  journal.stop();
  return { left, retained, thinned: counters.get('estimates_thinned') };
}

it('deletes all readings that are old within the hour, however many there are', () => {
  expect(kept(250_000, NOW)).toEqual({ left: 1, retained: [NOW], thinned: 130 });
});

it('thins estimates piece by piece until there is no more', () => {
  expect(kept(10, NOW).thinned).toBe(70);
});

it('goes by the newest reading where the clock of this machine is years ahead', () => {
  expect(kept(10, NOW + 20 * 365 * DAY).retained).toEqual([NOW]);
});
