import { expect, it } from 'vitest';
import { layoutOf, type TubeLayout } from '../../../src/core/track/layout.js';
import { sharedTubeScratch } from '../../../src/core/track/tube.js';
import { advance, saveUnit, startUnit } from '../../../src/core/unit.js';
import { mulberry } from '../../support/random.js';
import { frontedScan } from './fronted.js';
import { unitOf } from './plants.js';

const unit = unitOf();
const other = unitOf();
const SCANS = 40;
const GAS = { hot_top: 733.15, hot_bottom: 299, cold_bottom: 144.15, cold_top: 297 };
const OTHERS = { ...GAS, ambient: 283, mode: 1, flow: 0.9, power: 90e3 };

/** A unit's state after some scans; between any two of them another unit of the same size takes one. */
function stepped(beside: boolean): string {
  const [random, foreign] = [mulberry(7), mulberry(8)];
  const [state, next] = [startUnit(unit), startUnit(other)];
  for (let n = 0; n < SCANS; n++) {
    const time_ms = Date.UTC(2026, 5, 1) + n * unit.scan_period_s * 1000;
    const ask = { hours_at_W: [], profile: false };
    const fronts = { hot: 0.3 + 0.002 * n, cold: 0.35 };
    const noise = () => 0.6 * (random() - 0.5);
    advance(unit, state, frontedScan(unit, time_ms, fronts, OTHERS, noise), ask);
    if (!beside) continue;
    const far = { hot: 0.8 - 0.002 * n, cold: 0.7 };
    const noisy = () => 2 * (foreign() - 0.5);
    advance(other, next, frontedScan(other, time_ms, far, { ...OTHERS, flow: -0.7 }, noisy), ask);
  }
  return JSON.stringify(saveUnit(state), (_, v: unknown) =>
    ArrayBuffer.isView(v) ? Array.from(v as Float64Array) : v,
  );
}

it('units of one size share the arrays of a scan, and nothing of one gets into the other', () => {
  const [layout, same] = [unit, other].map(({ stores, estimator }) =>
    layoutOf(stores[0]!.strings[0]!, estimator),
  ) as [TubeLayout, TubeLayout];
  expect(sharedTubeScratch(layout, 0)).toBe(sharedTubeScratch(same, 0));
  expect(sharedTubeScratch(layout, 1)).not.toBe(sharedTubeScratch(layout, 0));
  expect(stepped(true)).toBe(stepped(false));
});
