import { describe, expect, it } from 'vitest';
import {
  advance,
  restoreUnit,
  saveUnit,
  startUnit,
  type UnitSnapshot,
} from '../../src/core/unit.js';
import { mulberry } from '../support/random.js';
import { frontedScan } from './track/fronted.js';
import { unitOf } from './track/plants.js';

const unit = unitOf();
const NONE = { hours_at_W: [], profile: false };
const PERIOD_MS = unit.scan_period_s * 1000;
const SCANS = Math.round((10 * 3600 * 1000) / PERIOD_MS);

/** A charged plant that is charged on, with its hot store's gas read off by so many kelvin between two scans. */
function charged(off_K: number, from: number, to: number, scans: number) {
  const state = startUnit(unit);
  const random = mulberry(41);
  const fronts = { hot: 1.5, cold: 1.5 };
  const gas = { hot_top: 733.15, hot_bottom: 299, cold_bottom: 144.15, cold_top: 297 };
  const others = { ...gas, ambient: 283, mode: 1, flow: 0.9, power: 90e3 };
  const told: string[] = [];
  let last = '';
  for (let n = 0; n < scans; n++) {
    const hot_top = gas.hot_top + (n >= from && n < to ? off_K : 0);
    // Without any noise the thermocouples would seem stuck.
    const noise = () => 0.6 * (random() - 0.5);
    const scan = frontedScan(unit, n * PERIOD_MS, fronts, { ...others, hot_top }, noise);
    const { estimate, events } = advance(unit, state, scan, NONE);
    for (const { kind, subject, transition, message } of events) {
      if (kind !== 'gas_temperature_off') continue;
      told.push(`${subject} ${transition} ${estimate.quality}`);
      last = message;
    }
  }
  return { told, last, state };
}

describe('a gas temperature that is off at an inlet', () => {
  it('is told once, degrades the quality while it is, and is told to be well again', () => {
    const half = Math.round(SCANS / 2);
    // The thermocouples nearest to it are held against rock that it has bent, until that is gone.
    const { told, last, state } = charged(100, 20, half, Math.round(1.3 * SCANS));
    expect(told).toEqual(['hot_top raised degraded', 'hot_top returned good']);
    expect(last).toMatch(/hot_top of store hot agrees with the rock/);
    expect(state.gas.every((g) => !g.charge_inlet.doubtful)).toBe(true);
  });

  it('is not told of a sound channel', () => {
    expect(charged(0, 0, 0, SCANS).told).toEqual([]);
  });

  it('is remembered over a restart; a state saved before it was looked at starts without it', () => {
    const { state, last } = charged(100, 20, SCANS, Math.round(SCANS / 2));
    expect(last).toMatch(
      /reads 100 K more than the rock behind it, at (459\.[5-9]|460\.[0-5]) degC/,
    );
    const saved = saveUnit(state);
    expect(restoreUnit(unit, saved).gas).toEqual(state.gas);
    const { gas: _none, ...before } = saved.state;
    const old = { version: saved.version, state: before } as UnitSnapshot;
    const { gas } = restoreUnit(unit, old);
    expect(gas.map((g) => g.charge_inlet.doubtful)).toEqual([false, false]);
  });
});
