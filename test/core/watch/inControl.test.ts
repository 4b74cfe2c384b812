import { describe, expect, it } from 'vitest';
import { inControlOf } from '../../../src/core/watch/inControl.js';
import { INDICATOR_KINDS } from '../../../src/core/watch/indicator.js';
import { INDICATOR_EVENTS } from '../../../src/core/watch/kinds.js';
import { INDICATORS_DEFAULT } from '../../../src/core/watch/rules.js';
import { demo } from './indicators/rig.js';
import { storeOf, unitOf } from './units.js';

describe('how seldom a healthy unit is called degraded', () => {
  it('counts every indicator that raises an alert, of stores, strings and the unit', () => {
    // Two stores of three strings: 8 kinds of a store, 2 of a string, 3 of the unit.
    expect(inControlOf(demo)).toEqual({
      indicators: 8 * 2 + 2 * 6 + 3,
      each_d: 3000,
      unit_d: 3000 / 31,
    });
    expect(inControlOf(unitOf({ stores: [storeOf('hot', 'hot')] })).indicators).toBe(8 + 2 + 3);
    expect(INDICATOR_KINDS.filter((kind) => INDICATOR_EVENTS[kind] === undefined)).toEqual([
      'sensor_health',
    ]);
  });

  it('is by the time that is configured', () => {
    const unit = unitOf();
    const watch = { ...unit.watch, indicators: { ...INDICATORS_DEFAULT, in_control_d: 100 } };
    const { each_d, unit_d, indicators } = inControlOf({ ...unit, watch });
    expect(each_d).toBe(100);
    expect(unit_d * indicators).toBeCloseTo(100, 12);
  });
});
