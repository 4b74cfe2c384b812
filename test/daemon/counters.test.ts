import { describe, expect, it } from 'vitest';
import { Counters } from '../../src/daemon/counters.js';

const thermocouples = { thermocouples: 8, used: 5, rejected: 1, left_out: 2, missing: 0 };

describe('the counters of scans', () => {
  it('start at 0 and add up what scans bring, stores together and implausible readings by kind', () => {
    const counters = new Counters();
    expect(counters.all()).toMatchObject({ thermocouples: 0, implausible_flow: 0 });
    const stores = { hot: thermocouples, cold: { ...thermocouples, used: 4, missing: 1 } };
    const gas = (channel: string) => ({ channel, kind: 'gas_temperature' as const });
    const flow = { channel: 'flow', kind: 'flow' } as const;
    const mode = { mode_disagrees: false, mode_disagreements: 4 };
    const surprise = { hot: 1 };
    counters.addScan({ stores, surprise, implausible: [gas('top'), gas('bottom'), flow], ...mode });
    const against = { mode_disagrees: true, mode_disagreements: 5 };
    counters.addScan({ stores: { hot: thermocouples }, surprise, implausible: [flow], ...against });
    expect(counters.all()).toMatchObject({
      thermocouples: 24,
      thermocouples_used: 14,
      thermocouples_rejected: 3,
      thermocouples_left_out: 6,
      thermocouples_missing: 1,
      implausible_gas_temperature: 2,
      implausible_flow: 2,
      implausible_power: 0,
      implausible_ambient_temperature: 0,
      mode_disagreements: 1,
    });
  });
});
