import { afterEach, beforeEach, describe, expect, it, vi } from 'vitest';
import { Intake, type IntakeReading } from '../../../src/adapters/mqtt/intake.js';
import type { Delivery } from '../../../src/adapters/mqtt/link.js';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { scanUnit } from '../../core/scan/plant.js';

const unit = (id: string) => ({ ...scanUnit(), id }) as UnitDefinition;
const source = (of: string, topic: string, ...channels: string[]) => ({
  ...{ unit: of, topic, channels },
  payload: channels.length > 1 ? ('array' as const) : ('value' as const),
});

/** An intake with a journal that can fail, and a list of what was done in which order. */
function harness() {
  const done: string[] = [];
  const rows: IntakeReading[] = [];
  const counts: Record<string, number> = {};
  const notices: string[] = [];
  const disk = { full: false };
  const intake = new Intake({
    units: [unit('u1'), unit('u2')],
    sources: [
      source('u1', 'one/a', 'a'),
      source('u1', 'one/bc', 'b', 'c'),
      source('u2', 'two/a', 'a'),
      source('u2', 'two/abce', 'a', 'b', 'c', 'e'),
      source('u1', 'both/e', 'e'),
      source('u2', 'both/e', 'e'),
    ],
    now: () => 5000,
    commit: (readings) => {
      if (disk.full) throw new Error('the disk is full');
      rows.push(...readings);
      done.push(`commit ${readings.length}`);
    },
    count: (name, by) => {
      counts[name] = (counts[name] ?? 0) + by;
    },
    unwanted: (topic) => done.push(`unwanted ${topic}`),
    notice: (kind, text) => notices.push(`${kind}: ${text}`),
  });
  const send = (topic: string, content: unknown, name = topic): Delivery => {
    const text = typeof content === 'string' ? content : JSON.stringify(content);
    const acknowledge = () => void done.push(`ack ${name}`);
    const delivery = { topic, payload: Buffer.from(text), duplicate: false, acknowledge };
    intake.receive(delivery);
    return delivery;
  };
  return { intake, done, rows, counts, notices, disk, send };
}

beforeEach(() => void vi.useFakeTimers());
afterEach(() => void vi.useRealTimers());

describe('the intake', () => {
  it('acknowledges in order of arrival, after one commit for all, within 50 ms', () => {
    const { done, send } = harness();
    send('one/a', { time: 1, value: 1 });
    send('one/bc', { time: 1, values: [2, 3] });
    send('nowhere', { time: 1, value: 1 });
    expect(done).toEqual(['unwanted nowhere']);
    vi.advanceTimersByTime(50);
    expect(done.slice(1)).toEqual(['commit 3', 'ack one/a', 'ack one/bc', 'ack nowhere']);
  });

  it('commits a full group once a turn of the loop brings no more, and takes all with it', () => {
    const { done, send } = harness();
    for (let i = 0; i < 40; i++) send('one/a', { time: i, value: i });
    vi.advanceTimersToNextTimer();
    for (let i = 40; i < 60; i++) send('one/a', { time: i, value: i });
    vi.advanceTimersToNextTimer();
    expect(done).toEqual([]);
    vi.advanceTimersToNextTimer();
    expect(done[0]).toBe('commit 60');
    expect(done).toHaveLength(61);
    for (let i = 0; i < 2048; i++) send('one/a', { time: 100 + i, value: i });
    expect(done[61]).toBe('commit 2048');
  });

  it('commits within 50 ms although each turn of the loop brings more', () => {
    const { done, send } = harness();
    for (let i = 0; i < 20; i++) send('one/a', { time: i, value: i });
    for (let ms = 0; ms < 50 && done.length === 0; ms++) {
      send('one/a', { time: 100 + ms, value: ms });
      vi.advanceTimersByTime(1);
    }
    expect(done[0]).toMatch(/^commit (2|3|4|5|6)\d$/);
  });

  it('knows copies of all that one channel can have in flight', () => {
    const { done, send } = harness();
    for (let round = 0; round < 2; round++) {
      for (let i = 0; i < 1500; i++) send('one/a', { time: i, value: i });
    }
    vi.advanceTimersByTime(50);
    expect(done.filter((one) => one.startsWith('commit'))).toEqual(['commit 1500']);
  });

  it('acknowledges nothing that is not on the disk, and everything once it is', () => {
    const { intake, done, rows, counts, notices, disk, send } = harness();
    disk.full = true;
    send('one/a', { time: 1, value: 1 });
    vi.advanceTimersByTime(100);
    for (let i = 2; i < 60; i++) send('one/a', { time: i, value: i });
    vi.advanceTimersByTime(900);
    expect(done).toEqual([]);
    expect(intake.stuck).toBe(true);
    expect(notices.some((notice) => notice.includes('the disk is full'))).toBe(true);
    disk.full = false;
    vi.advanceTimersByTime(1100);
    expect(rows.map((row) => row.value)).toEqual(Array.from({ length: 59 }, (_, i) => i + 1));
    expect(done.filter((step) => step.startsWith('ack'))).toHaveLength(59);
    expect(counts.readings).toBe(59);
    expect(intake.stuck).toBe(false);
  });

  it('keeps one of an exact copy and counts it, also of what stood in the journal before', () => {
    const { intake, rows, counts, send } = harness();
    intake.remember([
      { unit: 'u1', channel: 'a', time_ms: 1, arrival_ms: 2, value: 7, quality: 'good' },
    ]);
    send('one/a', { time: 1, value: 7 });
    send('one/a', { time: 2, value: 7 });
    send('one/a', { time: 2, value: 7 });
    send('one/a', { time: 2, value: 8 });
    intake.flush();
    expect(rows.map((row) => [row.time_ms, row.value])).toEqual([
      [2, 7],
      [2, 8],
    ]);
    expect(counts).toMatchObject({ messages: 4, readings: 2, repeated: 2 });
  });

  it('knows every copy of a group at its greatest, after a kill before the first acknowledgement', () => {
    const first = harness();
    const group = (send: ReturnType<typeof harness>['send']) => {
      for (let i = 0; i < 2047; i++) send('two/abce', { time: 1000 * i, values: [i, -i, 0, 1] });
    };
    group(first.send);
    first.intake.flush();
    expect(first.rows).toHaveLength(4 * 2047);
    const next = harness();
    expect(next.intake.remembered).toBe(4 * 2048);
    next.intake.remember(first.rows.slice(-next.intake.remembered));
    group(next.send);
    next.send('two/abce', { time: 1e9, values: [1, 2, 3, 4] });
    next.intake.flush();
    expect(next.counts).toMatchObject({ repeated: 4 * 2047, readings: 4 });
    expect(next.rows.map(({ time_ms }) => time_ms)).toEqual([1e9, 1e9, 1e9, 1e9]);
  });

  it('gives a topic that several units share to each of them', () => {
    const { intake, rows, send } = harness();
    send('both/e', { time: 1, value: 7 });
    intake.flush();
    expect(rows.map((row) => [row.unit, row.channel])).toEqual([
      ['u1', 'e'],
      ['u2', 'e'],
    ]);
  });

  it('counts and tells each kind of fault with the topic, and acknowledges the message', () => {
    const { intake, done, rows, counts, notices, send } = harness();
    send('one/a', 'no json');
    send('one/a', { time: 1, value: '5' });
    send('one/bc', { time: 1, values: [1] });
    send('one/bc', { time: 1, values: [1, 'x'] });
    send('one/a', { time: 2, value: 5, quality: 'fine' });
    send('one/a', { value: 5 });
    send('old/topic', { time: 1, value: 5 });
    intake.flush();
    expect(counts).toMatchObject({
      messages: 7,
      malformed: 2,
      wrong_length: 1,
      bad_element: 1,
      unknown_quality: 1,
      without_time: 1,
      unknown_topic: 1,
    });
    expect(done.filter((step) => step.startsWith('ack'))).toHaveLength(7);
    expect(rows).toHaveLength(4);
    expect(notices).toContain('malformed: topic one/a: no json');
    expect(notices).toContain('unknown_topic: nothing is configured for topic old/topic');
  });

  it('tells the beginning of a long payload only', () => {
    const { notices, send } = harness();
    send('one/a', `[${'1,'.repeat(100_000)}1]`);
    expect(notices[0]!.length).toBeLessThan(200);
    expect(notices[0]).toContain('(200003 characters)');
  });

  it('is refused where a source names a channel that the unit does not have', () => {
    const options = { now: () => 0, commit() {}, count() {}, unwanted() {}, notice() {} };
    const make = () =>
      new Intake({ ...options, units: [unit('u1')], sources: [source('u1', 't', 'zz')] });
    expect(make).toThrow(/topic t must name channels of unit u1, got zz/);
  });
});
