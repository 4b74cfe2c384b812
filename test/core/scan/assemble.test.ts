import { deserialize, serialize } from 'node:v8';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  Assembler,
  type AssemblerOptions,
  type AssemblerSnapshot,
  type ClosedScan,
} from '../../../src/core/scan/assemble.js';
import { scanUnit } from './plant.js';

const OPTIONS: AssemblerOptions = {
  deadline_ms: 10_000,
  future_tolerance_ms: 60_000,
  longest_gap_scans: 1000,
};
const [A, B, C, E] = [0, 1, 2, 3];

function add(
  assembler: Assembler,
  channel: number,
  time_s: number,
  value: number,
  arrival_s = 1e9,
) {
  return assembler.add({ channel, time_ms: time_s * 1000, arrival_ms: arrival_s * 1000, value });
}

function drain(assembler: Assembler): ClosedScan[] {
  const closed: ClosedScan[] = [];
  for (let scan = assembler.take(); scan; scan = assembler.take()) closed.push(scan);
  return closed;
}

describe('a scan', () => {
  it('closes as soon as every periodic channel has spoken, without waiting for the others', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    add(assembler, A, 60, 1);
    add(assembler, B, 61, 2);
    expect(drain(assembler)).toEqual([]);
    add(assembler, C, 60.5, 3);
    const [closed] = drain(assembler);
    expect(closed).toMatchObject({ index: 2, cause: 'complete', reported: 3 });
    expect(closed!.scan.time_ms).toBe(61_000);
    expect([...closed!.scan.values]).toEqual([1, 2, 3, Number.NaN]);
  });

  it('holds the floor of source time over period, also before 1970', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    for (const channel of [A, B, C]) add(assembler, channel, -0.001, channel);
    for (const channel of [A, B, C]) add(assembler, channel, 29.999, channel);
    expect(drain(assembler).map((closed) => closed.index)).toEqual([-1, 0]);
  });

  it('that lacks a channel closes once a reading is past its end and deadline', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    add(assembler, A, 0, 1);
    add(assembler, A, 39.999, 2);
    expect(drain(assembler)).toEqual([]);
    add(assembler, A, 40, 3);
    const [closed, ...more] = drain(assembler);
    expect(closed).toMatchObject({ index: 0, cause: 'deadline', reported: 1 });
    expect([...closed!.scan.values]).toEqual([1, Number.NaN, Number.NaN, Number.NaN]);
    expect(more).toEqual([]);
  });

  it('takes the newest of several readings of a channel, whatever their order of arrival', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    expect(add(assembler, A, 10, 1)).toBe('taken');
    expect(add(assembler, A, 20, 2)).toBe('taken');
    expect(add(assembler, A, 15, 3)).toBe('out_of_order');
    add(assembler, B, 0, 0);
    add(assembler, C, 0, 0);
    expect(drain(assembler)[0]!.scan.values[A]).toBe(2);
  });

  it('takes the last of two readings with the same time and counts it as repeated', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    add(assembler, A, 10, 1);
    expect(add(assembler, A, 10, 5)).toBe('repeated');
    add(assembler, B, 0, 0);
    add(assembler, C, 0, 0);
    expect(drain(assembler)[0]!.scan.values[A]).toBe(5);
  });

  it('counts a bad reading as spoken', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    add(assembler, A, 1, Number.NaN);
    add(assembler, B, 1, 2);
    add(assembler, C, 1, 3);
    expect(drain(assembler)[0]).toMatchObject({ cause: 'complete', reported: 3 });
  });

  it('waits for an older scan that is still open, so that time only runs forward', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    add(assembler, A, 0, 1);
    for (const channel of [A, B, C]) add(assembler, channel, 30, 2);
    expect(drain(assembler)).toEqual([]);
    expect(add(assembler, B, 5, 7)).toBe('out_of_order');
    expect(add(assembler, C, 5, 8)).toBe('out_of_order');
    const closed = drain(assembler);
    expect(closed.map(({ index }) => index)).toEqual([0, 1]);
    expect([...closed[0]!.scan.values].slice(0, 3)).toEqual([1, 7, 8]);
  });

  it('carries the value of a channel that reports by exception until its longest silence', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    add(assembler, E, 0, 300);
    for (let i = 0; i < 7; i++) for (const channel of [A, B, C]) add(assembler, channel, i * 30, 1);
    const closed = drain(assembler);
    expect(closed.map(({ scan }) => scan.values[E])).toEqual([
      ...[300, 300, 300, 300, 300],
      ...[Number.NaN, Number.NaN],
    ]);
    expect(closed.map(({ scan }) => scan.held[E])).toEqual([0, 1, 1, 1, 1, 0, 0]);
  });
});

describe('a reading', () => {
  it('by exception, just behind a scan that was complete, holds from the next scan on', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    for (const channel of [A, B, C]) add(assembler, channel, 1, channel);
    expect(drain(assembler)).toHaveLength(1);
    expect(add(assembler, E, 20, 7)).toBe('carried');
    for (const channel of [A, B, C]) add(assembler, channel, 31, channel);
    expect([...drain(assembler)[0]!.scan.values]).toEqual([0, 1, 2, 7]);
    // One that is older than the deadline has missed its scan, but holds all the same where it is the newest.
    for (const channel of [A, B, C]) add(assembler, channel, 75, channel);
    expect(drain(assembler)).toHaveLength(1);
    expect(add(assembler, E, 62, 8)).toBe('late');
    expect(add(assembler, E, 61, 9)).toBe('late');
    // Nor is it surplus where its scan has a later one: each change counts once a rewind takes it in.
    expect(add(assembler, E, 20, 7)).toBe('late');
    for (const channel of [A, B, C]) add(assembler, channel, 91, channel);
    const [{ scan }] = drain(assembler) as [ClosedScan];
    expect([[...scan.values], [...scan.held]]).toEqual([
      [0, 1, 2, 8],
      [0, 0, 0, 1],
    ]);
  });

  it('of a scan that was closed without it is late, with it surplus; neither changes anything', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    add(assembler, A, 0, 1);
    assembler.closeThrough(0);
    drain(assembler);
    expect(add(assembler, B, 5, 2)).toBe('late');
    expect(add(assembler, A, 5, 2)).toBe('surplus');
    expect(drain(assembler)).toEqual([]);
  });

  it('stamped further into the future than the tolerance closes nothing and stands nowhere', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    expect(add(assembler, A, 1000, 1, 1000)).toBe('taken');
    expect(add(assembler, A, 1060.001, 1, 1000)).toBe('future');
    expect(add(assembler, A, 4e6, 1, 1000)).toBe('future');
    expect(assembler.newest).toBe(1_000_000);
    expect(drain(assembler)).toEqual([]);
    expect(add(assembler, A, 1060, 1, 1000)).toBe('taken');
  });

  it('stamped ahead within the tolerance waits in its scan and shuts no other channel out', () => {
    // The gateway of A runs 55 s fast for good; B and C are on time, B a little late.
    const assembler = new Assembler(scanUnit(), OPTIONS);
    const closed: ClosedScan[] = [];
    for (let now = 0; now < 600; now += 30) {
      expect(add(assembler, A, now + 55, 1, now)).toBe('taken');
      expect(add(assembler, C, now, 3, now)).toBe('taken');
      expect(add(assembler, B, now, 2, now + 5)).toBe('taken');
      closed.push(...drain(assembler));
    }
    expect(closed.map(({ index }) => index)).toEqual(closed.map((_, i) => i));
    expect(closed.length).toBeGreaterThan(17);
    for (const { scan, cause } of closed.slice(1)) {
      expect(cause).toBe('complete');
      expect([...scan.values].slice(0, 3)).toEqual([1, 2, 3]);
    }
    expect(assembler.newest).toBe(570_000);
  });

  it('stamped ahead once loses none of what others say meanwhile', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    const fates: string[] = [];
    for (let now = 0; now < 150; now += 30) {
      for (const channel of [A, B, C]) {
        const wrong = now === 30 && channel === A;
        fates.push(add(assembler, channel, wrong ? now + 58 : now, channel, now));
      }
    }
    expect(fates).toEqual(fates.map((_, i) => (i === 6 ? 'out_of_order' : 'taken')));
    // The one scan that lacks the reading with the wrong time closes by the next but one's.
    const found = drain(assembler).map(({ cause }) => cause);
    expect(found).toEqual(['complete', 'deadline', 'complete', 'complete', 'complete']);
  });

  it('stamped ahead as the very first begins no later than its arrival', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    expect(add(assembler, A, 655, 1, 600)).toBe('taken');
    expect(add(assembler, B, 600, 2, 600)).toBe('taken');
    // Clocks that differ by less than a scan are the rule: no scan is made of that.
    const usual = new Assembler(scanUnit(), OPTIONS);
    for (const channel of [A, B, C]) add(usual, channel, 600, channel, 599.9);
    expect(drain(usual).map(({ index }) => index)).toEqual([20]);
  });

  it('with a channel or a time that cannot be is misuse, named with its value', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    expect(() => add(assembler, 4, 0, 1)).toThrow(/reading\.channel .* got 4/);
    expect(() => add(assembler, 0, 0.0001, 1)).toThrow(/reading\.time_ms .* got 0\.1/);
  });
});

describe('a gap', () => {
  it('ticks at the scan period with empty scans at their nominal start', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    for (const channel of [A, B, C]) add(assembler, channel, 15, 1);
    for (const channel of [A, B, C]) add(assembler, channel, 135, 1);
    const closed = drain(assembler);
    expect(closed.map(({ scan }) => scan.time_ms)).toEqual([15e3, 30e3, 60e3, 90e3, 135e3]);
    expect(closed.map(({ reported }) => reported)).toEqual([3, 0, 0, 0, 3]);
  });

  it('of a silent plant ticks by the deadline of the clock that the caller has', () => {
    const assembler = new Assembler(scanUnit(), OPTIONS);
    expect(assembler.due(1e9)).toBeNull();
    for (const channel of [A, B, C]) add(assembler, channel, 0, 1);
    expect(drain(assembler)).toHaveLength(1);
    expect(assembler.due(69_999)).toBeNull();
    expect(assembler.due(70_000)).toBe(1);
    assembler.closeThrough(1);
    expect(assembler.due(70_000)).toBeNull();
    expect(drain(assembler).map(({ scan }) => scan.time_ms)).toEqual([30_000]);
  });

  it('longer than the longest is bridged by one scan, and the scans left out are counted', () => {
    const assembler = new Assembler(scanUnit(), { ...OPTIONS, longest_gap_scans: 10 });
    for (const channel of [A, B, C]) add(assembler, channel, 0, 1);
    for (const channel of [A, B, C]) add(assembler, channel, 30e6, 1);
    // Scan 999,999 may still come: its deadline is 10 s after the one reading of the next scan.
    expect(drain(assembler).map(({ index }) => index)).toEqual([0, 999_998]);
    expect(assembler.skippedScans).toBe(999_997);
    assembler.closeThrough(999_999);
    expect(drain(assembler).map(({ index }) => index)).toEqual([999_999, 1_000_000]);
  });
});

type Step = { channel: number; jitter: number; forward: number; value: number; close: boolean };
const steps = fc.array(
  fc.record({
    channel: fc.integer({ min: 0, max: 3 }),
    jitter: fc.integer({ min: -45_000, max: 45_000 }),
    forward: fc.integer({ min: 0, max: 12_000 }),
    value: fc.double({ noDefaultInfinity: true }),
    close: fc.boolean(),
  }),
  { maxLength: 120 },
);

function apply(assembler: Assembler, step: Step, time_ms: number): ClosedScan[] {
  assembler.add({
    channel: step.channel,
    time_ms: time_ms + step.jitter,
    arrival_ms: 1e12,
    value: step.value,
  });
  const due = step.close ? assembler.due(time_ms) : null;
  if (due !== null) assembler.closeThrough(due);
  return drain(assembler);
}

describe('any sequence of readings', () => {
  it('gives scans that follow each other without a gap, each with its own source times', () => {
    fc.assert(
      fc.property(steps, (list) => {
        const assembler = new Assembler(scanUnit(), OPTIONS);
        let time_ms = 0;
        const closed = list.flatMap((step) => {
          time_ms += step.forward;
          return apply(assembler, step, time_ms);
        });
        closed.forEach(({ index, scan }, i) => {
          if (i > 0) expect(index).toBe(closed[i - 1]!.index + 1);
          expect(Math.floor(scan.time_ms / 30_000)).toBe(index);
        });
      }),
      { seed: 1, numRuns: 200 },
    );
  });

  it('gives the same scans where it was saved, serialized and restored on the way', () => {
    fc.assert(
      fc.property(steps, fc.nat(120), (list, cut) => {
        const through = new Assembler(scanUnit(), OPTIONS);
        let broken = new Assembler(scanUnit(), OPTIONS);
        let time_ms = 0;
        list.forEach((step, i) => {
          time_ms += step.forward;
          if (i === cut) {
            const image = deserialize(serialize(broken.save())) as AssemblerSnapshot;
            broken = new Assembler(scanUnit(), OPTIONS);
            broken.restore(image);
          }
          expect(apply(broken, step, time_ms)).toEqual(apply(through, step, time_ms));
        });
      }),
      { seed: 2, numRuns: 200 },
    );
  });

  it('keeps no more scans open than deadline, period and jitter span', () => {
    fc.assert(
      fc.property(steps, (list) => {
        const assembler = new Assembler(scanUnit(), OPTIONS);
        let time_ms = 0;
        for (const step of list) {
          time_ms += step.forward;
          apply(assembler, step, time_ms);
          // Newest - deadline lies in the first open scan or before: (10 s + 30 s) / 30 s, rounded up.
          expect(assembler.save().slots.length).toBeLessThanOrEqual(2);
        }
      }),
      { seed: 3, numRuns: 200 },
    );
  });
});

describe('a snapshot', () => {
  it('of other channels or another period is refused', () => {
    const image = new Assembler(scanUnit(), OPTIONS).save();
    expect(() => new Assembler(scanUnit(30, ['x']), OPTIONS).restore(image)).toThrow(/channels/);
    expect(() => new Assembler(scanUnit(60), OPTIONS).restore(image)).toThrow(/period_ms/);
  });
});
