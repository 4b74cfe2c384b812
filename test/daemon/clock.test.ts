import { afterEach, beforeEach, describe, expect, it, vi } from 'vitest';
import { PacedClock, SteadyClock } from '../../src/daemon/clock.js';
import { Notices } from '../../src/daemon/notices.js';
import { createLog } from '../../src/log.js';

beforeEach(() => void vi.useFakeTimers({ toFake: ['performance', 'Date'] }));
afterEach(() => void vi.useRealTimers());

describe('the clock for deadlines', () => {
  it('counts on, but never longer than a step while the process stood or the clock was set', () => {
    let now = 1000;
    const steady = new SteadyClock({ now: () => now, speed: 1 }, 400);
    now += 300;
    expect(steady.now()).toBe(300);
    now += 3_600_000;
    expect(steady.now()).toBe(700);
    now -= 7_200_000;
    expect(steady.now()).toBe(700);
    now += 100;
    expect(steady.now()).toBe(800);
  });
});

describe('the clock of the simulated plant', () => {
  it('runs at its speed between steps, but not ahead of a plant that is slower', () => {
    const clock = new PacedClock(1_000_000, 30_000, 300);
    vi.advanceTimersByTime(50);
    expect(clock.now()).toBeCloseTo(1_015_000, 3);
    expect(clock.wait_ms).toBeCloseTo(50, 6);
    vi.advanceTimersByTime(5000);
    expect(clock.now()).toBe(1_030_000);
    expect(clock.wait_ms).toBe(0);
    clock.step(1_030_000);
    expect(clock.now()).toBe(1_030_000);
    expect(clock.wait_ms).toBeCloseTo(100, 6);
  });
});

describe('notices', () => {
  it('are one line per kind and minute, with how many went unsaid', () => {
    const lines: { kind: string; unsaid?: number; msg: string }[] = [];
    const destination = { write: (line: string) => void lines.push(JSON.parse(line)) };
    const notices = new Notices(createLog({ pretty: false, destination }));
    for (let i = 0; i < 5; i++) notices.warn('late', `reading ${i}`);
    notices.warn('malformed', 'topic a: \u001b[31mred');
    vi.advanceTimersByTime(60_001);
    notices.warn('late', 'reading 6');
    expect(lines.map(({ kind, unsaid, msg }) => [kind, unsaid, msg])).toEqual([
      ['late', undefined, 'reading 0'],
      ['malformed', undefined, expect.not.stringContaining('\u001b')],
      ['late', 3, 'reading 4'],
      ['late', undefined, 'reading 6'],
    ]);
  });
});
