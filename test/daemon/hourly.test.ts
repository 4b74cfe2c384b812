import { describe, expect, it } from 'vitest';
import { Counters } from '../../src/daemon/counters.js';
import { Hourly } from '../../src/daemon/hourly.js';
import { createLog } from '../../src/log.js';

function made(qualities: (string | null)[]) {
  const lines: Record<string, unknown>[] = [];
  const write = (line: string) => {
    lines.push(JSON.parse(line) as Record<string, unknown>);
  };
  const counters = new Counters();
  const hourly = new Hourly({
    log: createLog({ destination: { write }, pretty: false }),
    clock: { now: () => 0, speed: 36_000 } as never,
    counters,
    qualities: () => qualities,
    standing: () => 2,
    backlogs: () => ({ pipeline: 1, influxdb: 40 }),
  });
  return { hourly, counters, lines };
}

describe('the line of an hour', () => {
  it('tells what came in that hour alone, units by quality and what waits', () => {
    const { hourly, counters, lines } = made(['good', 'good', 'stale', null]);
    counters.add('scans', 7);
    hourly.start();
    counters.add('scans', 60);
    counters.add('readings', 5040);
    counters.add('late', 3);
    counters.add('history_failures', 1);
    hourly.tell();
    counters.add('scans', 59);
    hourly.tell();
    hourly.stop();
    expect(lines).toHaveLength(2);
    expect(lines[0]).toMatchObject({ kind: 'hour', scans: 60, late: 3, waiting: 41, standing: 2 });
    expect(lines[0]!.msg).toMatch(
      /^last hour: 60 scans of 4 units \(2 good, 1 stale, 1 not begun\) from 5040 readings, 3 late, 0 malformed, 1 failures; 0 events, 2 alarms and alerts stand; 41 entries wait; \d+ MB$/,
    );
    expect(lines[1]).toMatchObject({ scans: 59, readings: 0, late: 0 });
  });

  it('comes by itself after an hour of plant time', async () => {
    const { hourly, lines } = made(['good']);
    hourly.start();
    await expect.poll(() => lines.length).toBeGreaterThan(1);
    hourly.stop();
    const told = lines.length;
    await new Promise((resolve) => setTimeout(resolve, 250));
    expect(lines).toHaveLength(told);
  });
});
