import { describe, expect, it } from 'vitest';
import { replayLine } from '../../src/commands/replayLine.js';
import type { Estimate, StoreEstimate } from '../../src/core/estimate.js';
import type { WatchEvent } from '../../src/core/watch/event.js';

// Keys in an order of their own: that of the line is the contract's.
const store: StoreEstimate = {
  outlet_K: 300,
  front_views: [],
  sensors: {
    rejected: [
      { evidence: 'flat for 3 h', since: '2025-03-01T00:00:00.000Z', verdict: 'stuck', id: 'T1' },
    ],
    used: 3,
  },
  strings: [{ width_m: 1, position_m: 2, flow_factor_sigma: 0.1, flow_factor: 1, id: 'axis' }],
  heat_transfer_factor_sigma: 0.1,
  heat_transfer_factor: 1,
  spread_ratio: null,
  energy_position_m: Number.NaN,
  fronts_reason: null,
  fronts: [{ width_sigma_m: null, width_m: null, position_sigma_m: 0.1, position_m: 2 }],
  stored_sigma_MWh_th: 0.1,
  stored_MWh_th: 1,
  soc_sigma: 0.01,
  soc: 0.5,
};
const estimate: Estimate = {
  stores: { hot: store },
  state_of_charge: 0.5,
  quality: 'good',
  mode: 'charge',
  revision: 0,
  unit: 'U1',
  time: '2025-03-01T06:00:00.000Z',
};
const event: WatchEvent = {
  id: 'U1/sensor_rejected/T1',
  unit: 'U1',
  kind: 'sensor_rejected',
  class: 'alert',
  priority: 'low',
  subject: 'T1',
  transition: 'raised',
  time: '2025-03-01T06:00:00.000Z',
  value: Number.POSITIVE_INFINITY,
  limit: null,
  message: 'T1 is stuck',
};

const STORE_KEYS = [
  'soc',
  'soc_sigma',
  'stored_MWh_th',
  'stored_sigma_MWh_th',
  'fronts',
  'fronts_reason',
  'energy_position_m',
  'spread_ratio',
  'heat_transfer_factor',
  'heat_transfer_factor_sigma',
  'strings',
  'sensors',
];

describe('a line of the replay', () => {
  const line = JSON.parse(replayLine({ estimate, profile: null, events: [event] }));
  const hot = line.stores.hot;

  it('has the keys of the contract in its order', () => {
    expect(Object.keys(line)).toEqual([
      'time',
      'unit',
      'revision',
      'mode',
      'quality',
      'state_of_charge',
      'stores',
      'events',
    ]);
    expect(Object.keys(hot).slice(0, STORE_KEYS.length)).toEqual(STORE_KEYS);
    expect(Object.keys(hot.fronts[0])).toEqual([
      'position_m',
      'position_sigma_m',
      'width_m',
      'width_sigma_m',
    ]);
    expect(Object.keys(hot.strings[0])).toEqual([
      'id',
      'flow_factor',
      'flow_factor_sigma',
      'position_m',
      'width_m',
    ]);
    expect(Object.keys(hot.sensors)).toEqual(['used', 'rejected']);
    expect(Object.keys(hot.sensors.rejected[0]).slice(0, 3)).toEqual(['id', 'verdict', 'since']);
  });

  it('has null where a number is none, and loses nothing that the estimate says', () => {
    expect(hot.energy_position_m).toBeNull();
    expect(line.events[0].value).toBeNull();
    expect(hot).toMatchObject({ outlet_K: 300, front_views: [], soc: 0.5, stored_MWh_th: 1 });
    expect(hot.sensors.rejected[0].evidence).toBe('flat for 3 h');
  });

  it('has hours only where they were asked for', () => {
    const three = { p10: 3, p50: 2, p90: 1 };
    const answer = { ends_by: 'flow', energy_MWh_el: three, hours: three, power_MW: 2 } as const;
    const asked = replayLine({
      estimate: { ...estimate, dispatch: [answer] },
      profile: null,
      events: [],
    });
    expect(line.dispatch).toBeUndefined();
    expect(Object.keys(JSON.parse(asked)).slice(-2)).toEqual(['dispatch', 'events']);
    expect(asked).toContain(
      '"dispatch":[{"power_MW":2,"hours":{"p90":1,"p50":2,"p10":3},' +
        '"energy_MWh_el":{"p90":1,"p50":2,"p10":3},"ends_by":"flow"}]',
    );
  });
});
