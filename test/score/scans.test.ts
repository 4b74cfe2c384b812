import { describe, expect, it } from 'vitest';
import {
  byException,
  exceptions,
  silentStore,
  sparse,
  stepsBetween,
} from '../../tools/score/own/scans.js';
import { unitWith } from '../../tools/score/sensorSets.js';
import { RandomStream } from '../plant/random.js';

const unit = unitWith('five', 'independent');
const count = unit.channels.length;
const at = (id: string) => unit.channels.findIndex((c) => c.id === id);
const random = () => new RandomStream(3, 'test');
const reading = (value: number) => ({
  values: new Float64Array(count).fill(value),
  held: new Uint8Array(count),
});

describe('uneven scans', () => {
  it('come after every multiple of 15 s between their bounds alike', () => {
    const stream = random();
    const spacing = stepsBetween(30, 90);
    const drawn = Array.from({ length: 5000 }, () => spacing(stream));
    const times = [30, 45, 60, 75, 90].map((s) => drawn.filter((d) => d === s).length);
    expect(times.reduce((a, b) => a + b, 0)).toBe(5000);
    // 1000 each, standard error 28.
    for (const n of times) expect(Math.abs(n - 1000)).toBeLessThan(4 * 28);
  });
});

describe('reports by exception', () => {
  const reporting = byException(unit);
  const thermocouple = unit.channels.findIndex((c) => c.role.kind === 'thermocouple');

  it('have deadbands by what the channel measures', () => {
    const deadband = (i: number) => {
      const own = reporting.channels[i]!.reporting;
      return own.kind === 'by_exception' ? own.deadband : null;
    };
    expect(deadband(thermocouple)).toBe(1);
    expect(deadband(at('hot_gas_top'))).toBe(1);
    expect(deadband(at('flow'))).toBeCloseTo(0.01 * unit.limits.discharge.flow_max_kg_s, 12);
    expect(deadband(at('mode'))).toBe(0);
  });

  it('keep the last value within the deadband, say the next beyond it, and repeat in time', () => {
    const report = exceptions(reporting);
    const say = (value: number, minute: number) => {
      const { values, held } = report(reading(value), 60 * minute, 60e3 * minute);
      return [values[thermocouple], held[thermocouple]];
    };
    expect(say(400, 0)).toEqual([400, 0]);
    expect(say(400.9, 1)).toEqual([400, 1]);
    expect(say(399.1, 2)).toEqual([400, 1]);
    expect(say(401.1, 3)).toEqual([401.1, 0]);
    expect(say(400.5, 4)).toEqual([401.1, 1]);
    // Half of the longest silence, 30 min.
    expect(say(400.5, 17)).toEqual([401.1, 1]);
    expect(say(400.5, 18)).toEqual([400.5, 0]);
  });
});

describe('readings that are withheld', () => {
  it('are four in five, each by itself', () => {
    const report = sparse(unit, random());
    let there = 0;
    for (let n = 0; n < 400; n++) {
      there += report(reading(1), 0, 0).values.filter((v) => !Number.isNaN(v)).length;
    }
    const all = 400 * count;
    // Binomial standard error.
    expect(Math.abs(there / all - 0.2)).toBeLessThan(4 * Math.sqrt((0.2 * 0.8) / all));
  });

  it('are those of one store for an hour', () => {
    const stores = new Set<string>();
    for (let seed = 0; seed < 12; seed++) {
      const report = silentStore(unit, new RandomStream(seed, 'test'));
      const missing = (hour: number) =>
        unit.channels.filter((_, i) => Number.isNaN(report(reading(1), 3600 * hour, 0).values[i]));
      expect(missing(4.74)).toEqual([]);
      expect(missing(5.75)).toEqual([]);
      const own = missing(5).map((c) => ('store' in c.role ? c.role.store : 'none'));
      expect(new Set(own).size).toBe(1);
      expect(own.length).toBeGreaterThan(5);
      stores.add(own[0]!);
    }
    expect([...stores].sort()).toEqual(['cold', 'hot']);
  });
});
