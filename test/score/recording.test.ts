import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { Recording } from '../../tools/score/recording.js';
import { temporaryFolder } from '../support/folders.js';

const scans = Array.from({ length: 7 }, (_, n) => ({
  time_s: 1000 + 60 * (n + 1),
  readings: { a: 300 + 0.013 * n, b: n === 3 ? Number.NaN : 144.2, flow: -12.5 + n },
}));
const truths = scans.map((_, n) => [0.5 + n / 100, Number.NaN]);
const made = Recording.make(scans, truths, {
  start_s: 1000,
  period_s: 60,
  temperatures: ['a', 'b'],
  others: ['flow'],
  truths: ['hot.soc', 'hot.position_0'],
  hours: [{ scan: 5, power_W: 1e6, hours: 3.25 }],
});

describe('a recording', () => {
  it('keeps temperatures to half a step of 1/80 K, other readings and truths as single floats', () => {
    scans.forEach((scan, n) => {
      expect(Math.abs(made.reading('a', n) - scan.readings.a)).toBeLessThanOrEqual(0.5 / 80 + 1e-9);
      expect(made.reading('flow', n)).toBe(Math.fround(scan.readings.flow));
      expect(made.truth('hot.soc', n)).toBe(Math.fround(truths[n]![0]!));
      expect(made.time_ms(n)).toBe(scan.time_s * 1000);
    });
    expect(made.reading('b', 3)).toBeNaN();
    expect(made.truth('hot.position_0', 0)).toBeNaN();
  });

  it('comes back from disk as it was', () => {
    const file = join(temporaryFolder('score'), 'deep', 'one.bin');
    expect(Recording.load(file)).toBeNull();
    made.save(file);
    const back = Recording.load(file)!;
    expect(back.header).toEqual(made.header);
    for (let n = 0; n < scans.length; n++) {
      for (const id of ['a', 'b', 'flow']) expect(back.reading(id, n)).toEqual(made.reading(id, n));
      expect(back.truth('hot.soc', n)).toBe(made.truth('hot.soc', n));
    }
  });

  it('says which column it does not have', () => {
    expect(() => made.reading('c', 0)).toThrow(/column c/);
    expect(() => made.truth('c', 0)).toThrow(/truth c/);
  });
});
