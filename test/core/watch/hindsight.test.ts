import { describe, expect, it } from 'vitest';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import { differences, hindsight } from '../../../src/core/watch/hindsight.js';

const T = Date.UTC(2026, 0, 5, 6);
const at = (ms: number) => new Date(T + ms).toISOString();
const event = (subject: string, ms: number, transition: WatchEvent['transition'] = 'raised') =>
  ({
    ...{ id: `u/front_spread/${subject}`, unit: 'u', kind: 'front_spread', class: 'alert' },
    ...{ priority: 'low', subject, transition, time: at(ms), value: 2, limit: 1, message: 'Wide.' },
  }) as WatchEvent;

describe('what late readings say of now', () => {
  it('is told where it is not told yet, and only there', () => {
    const both = event('both', 10);
    const told = hindsight([both, event('gone', 20)], [event('both', 0), event('new', 30)], at(90));
    expect(told.map(({ subject, transition, time }) => [subject, transition, time])).toEqual([
      ['gone', 'returned', at(90)],
      ['new', 'raised', at(90)],
    ]);
    expect(told[1]!.message).toMatch(/^Wide\. Seen only by readings that came late; holds since /);
    expect(hindsight([both], [both], at(90))).toEqual([]);
  });
});

describe('what they say of the past', () => {
  it('differs where an event is in one account alone; its place within a scan is none', () => {
    const told = [event('a', 31_000), event('a', 62_000, 'returned'), event('b', 95_000)];
    const again = [event('a', 59_000), event('c', 70_000)];
    expect(differences(told, again, 30_000)).toEqual([
      expect.objectContaining({ id: 'u/front_spread/a', transition: 'returned', told: true }),
      expect.objectContaining({ id: 'u/front_spread/c', told: false, time: at(70_000) }),
      expect.objectContaining({ id: 'u/front_spread/b', told: true }),
    ]);
  });
});
