import { describe, expect, it } from 'vitest';
import { advance, startUnit } from '../../src/core/unit.js';
import { frontedScan } from './track/fronted.js';
import { unitOf } from './track/plants.js';

const unit = unitOf();
const NONE = { hours_at_W: [], profile: false };
const PERIOD_MS = unit.scan_period_s * 1000;
const GAS = { ambient: 283, hot_top: 730, hot_bottom: 299, cold_bottom: 146, cold_top: 297 };

/** Scans with standing fronts; `change` may spoil what one brings. */
function run(
  modes: readonly number[],
  change: (id: string, n: number, value: number) => number = (_, __, value) => value,
) {
  const state = startUnit(unit);
  return modes.map((mode, n) => {
    const power = mode > 0 ? 90e3 : mode < 0 ? -50e3 : 300;
    const others = { ...GAS, mode, flow: 0.9 * mode, power };
    const scan = frontedScan(unit, n * PERIOD_MS, { hot: 0.4, cold: 0.4 }, others);
    unit.channels.forEach(({ id }, i) => {
      scan.values[i] = change(id, n, scan.values[i] as number);
    });
    const { estimate, counts } = advance(unit, state, scan, NONE);
    return { estimate, counts: counts! };
  });
}

const standing = (scans: number) => Array.from({ length: scans }, () => 0);

describe('the thermocouples of a scan', () => {
  it('are each counted once, whatever became of them', () => {
    const modes = [1, 0, -1].flatMap((mode) => Array.from({ length: 12 }, () => mode));
    const spoilt = (id: string, n: number, value: number) => {
      if (id === 'h_3' && n > 5) return Number.NaN;
      if (id === 'h_6' && n > 8) return 9999;
      return id.startsWith('c_') && n % 7 === 3 ? Number.NaN : value;
    };
    const seen = new Set<string>();
    for (const { estimate, counts } of run(modes, spoilt)) {
      for (const store of unit.stores) {
        const { thermocouples, ...by } = counts.stores[store.id]!;
        const all = store.strings.flatMap((string) => string.thermocouples);
        expect(thermocouples).toBe(all.length);
        expect(by.used + by.rejected + by.left_out + by.missing).toBe(thermocouples);
        const { used, rejected } = estimate.stores[store.id]!.sensors;
        expect({ used: by.used, rejected: by.rejected }).toEqual({
          used,
          rejected: rejected.length,
        });
        for (const [what, count] of Object.entries(by)) {
          expect(count).toBeGreaterThanOrEqual(0);
          if (count > 0) seen.add(what);
        }
      }
    }
    expect([...seen].sort()).toEqual(['left_out', 'missing', 'rejected', 'used']);
  });

  it('are missing where a whole store is silent, and rejected where one of them is', () => {
    const silent = run(standing(6), (id, n, value) =>
      (id.startsWith('c_') && n === 5) || (id === 'h_3' && n >= 3) ? Number.NaN : value,
    );
    const { stores } = silent[5]!.counts;
    expect(stores.cold).toMatchObject({ thermocouples: 8, used: 0, rejected: 0, missing: 8 });
    expect(stores.hot).toMatchObject({ thermocouples: 8, used: 7, rejected: 1, missing: 0 });
  });

  it('are left out without a verdict while one reads far off but not for long enough to be named', () => {
    const [before, after] = run(standing(12), (id, n, value) =>
      id === 'h_4' && n === 11 ? value + 60 : value,
    ).slice(-2);
    expect(before!.counts.stores.hot).toMatchObject({ used: 8, rejected: 0, left_out: 0 });
    expect(after!.counts.stores.hot).toMatchObject({ used: 7, rejected: 0, left_out: 1 });
  });
});

describe('readings that no plant produces', () => {
  it('are told by channel and kind in the scan that brings them, and not after it', () => {
    const wild: Record<string, number> = { hot_top: 9999, flow: -500, power: 1e12, ambient: -40 };
    const scans = run(standing(14), (id, n, value) => (n === 12 ? (wild[id] ?? value) : value));
    const told = scans[12]!.counts.implausible.map(({ channel, kind }) => `${channel} ${kind}`);
    expect(told.sort()).toEqual([
      'ambient ambient_temperature',
      'flow flow',
      'hot_top gas_temperature',
      'power power',
    ]);
    expect(scans[12]!.estimate.quality).toBe('degraded');
    for (const n of [11, 13]) expect(scans[n]!.counts.implausible).toEqual([]);
  });

  it('are not those of thermocouples in the bed, which are judged one by one', () => {
    const scans = run(standing(4), (id, n, value) => (id === 'h_2' && n === 3 ? 9999 : value));
    expect(scans[3]!.counts.implausible).toEqual([]);
    expect(scans[3]!.counts.stores.hot!.rejected).toBe(1);
  });
});

describe('a mode that contradicts the flow', () => {
  it('is told in the scans that show it, and stays counted, also over a day without readings', () => {
    // A discharge is told while the meter says that gas goes the way of a charge.
    const modes = [1, 1, -1, -1, 1];
    const scans = run(modes, (id, _n, value) =>
      id === 'flow' ? 0.9 : id === 'power' ? Number.NaN : value,
    );
    expect(scans.map(({ counts }) => counts.mode_disagrees)).toEqual(modes.map((mode) => mode < 0));
    expect(scans.map(({ counts }) => counts.mode_disagreements)).toEqual([0, 0, 1, 2, 2]);

    const state = startUnit(unit);
    const fronts = { hot: 0.4, cold: 0.4 };
    const at = (time_ms: number, mode: number) =>
      advance(unit, state, frontedScan(unit, time_ms, fronts, { ...GAS, mode, flow: 0.9 }), NONE);
    at(0, -1);
    const { counts } = at(3 * 86_400_000, 1);
    expect(counts).toMatchObject({ mode_disagrees: false, mode_disagreements: 1 });
  });
});
