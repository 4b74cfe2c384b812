import { describe, expect, it } from 'vitest';
import { INDICATOR_KINDS } from '../../../../src/core/watch/indicator.js';
import { INDICATORS, indicatorsOf } from '../../../../src/core/watch/indicators.js';
import { INDICATOR_EVENTS, KIND_CLASSES } from '../../../../src/core/watch/kinds.js';
import { INDICATORS_DEFAULT } from '../../../../src/core/watch/rules.js';
import { unitOf } from '../units.js';

describe('the indicators', () => {
  it('are one of each kind, in their order', () => {
    expect(INDICATORS.map(({ kind }) => kind)).toEqual([...INDICATOR_KINDS]);
  });

  it('raise events that have a class', () => {
    for (const event of Object.values(INDICATOR_EVENTS))
      expect(KIND_CLASSES[event].class).toBe('alert');
  });

  it('decide as shipped where nothing is configured, the spread by its own block', () => {
    const unit = unitOf();
    const { rules, in_control_d } = indicatorsOf(unit);
    expect(in_control_d).toBe(INDICATORS_DEFAULT.in_control_d);
    expect(rules.spread_ratio).toEqual(unit.watch.spread_ratio);
    expect(rules.string_flow).toEqual(INDICATORS_DEFAULT.rules.string_flow);
    expect(indicatorsOf(unit)).toBe(indicatorsOf(unit));
  });
});
