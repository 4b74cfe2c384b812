import { advance, startUnit, type UnitState } from '../../src/core/unit.js';
import { frontedScan } from '../core/track/fronted.js';
import { unitOf } from '../core/track/plants.js';

/** A small unit that has taken in one scan: its profiles are drawn, its covariances those of a start. */
export function startedUnit(): UnitState {
  const unit = unitOf();
  const state = startUnit(unit);
  const scan = frontedScan(
    unit,
    Date.UTC(2025, 0, 1),
    { hot: 0.4, cold: 0.6 },
    { mode: 0, flow: 0, ambient: 283 },
  );
  advance(unit, state, scan, { hours_at_W: [], profile: false });
  return state;
}
