import { afterEach, beforeEach, expect, it, vi } from 'vitest';
import { Notices } from '../../src/daemon/notices.js';
import { createLog } from '../../src/log.js';

beforeEach(() => void vi.useFakeTimers());
afterEach(() => void vi.useRealTimers());

function noticesInto(lines: { msg: string; unsaid?: number; level: string }[]) {
  const destination = { write: (line: string) => void lines.push(JSON.parse(line)) };
  return new Notices(createLog({ pretty: false, destination }));
}

it('a kind is said once a minute, and then how it stands, with how many went unsaid', () => {
  const lines: { msg: string; unsaid?: number; level: string }[] = [];
  const notices = noticesInto(lines);
  for (let n = 0; n < 5; n++) notices.warn('down', `down ${n}`);
  notices.info('up', 'up');
  expect(lines.map(({ msg }) => msg)).toEqual(['down 0', 'up']);
  vi.advanceTimersByTime(60_000);
  expect(lines.slice(2)).toMatchObject([{ msg: 'down 4', unsaid: 3, level: 'warn' }]);
  // That one began a minute of its own; nothing more is said where nothing came.
  notices.warn('down', 'down 5');
  vi.advanceTimersByTime(59_000);
  expect(lines.length).toBe(3);
  vi.advanceTimersByTime(1_000);
  expect(lines.slice(3)).toMatchObject([{ msg: 'down 5' }]);
  vi.advanceTimersByTime(600_000);
  expect(lines.length).toBe(4);
});

it('what is unsaid at the end is said then, and never after', () => {
  const lines: { msg: string; unsaid?: number; level: string }[] = [];
  const notices = noticesInto(lines);
  notices.warn('down', 'first');
  notices.info('down', 'last');
  notices.stop();
  expect(lines.map(({ msg, level }) => [msg, level])).toEqual([
    ['first', 'warn'],
    ['last', 'info'],
  ]);
  vi.advanceTimersByTime(600_000);
  expect(lines.length).toBe(2);
});
