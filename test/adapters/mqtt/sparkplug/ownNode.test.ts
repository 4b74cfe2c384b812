import { afterEach, describe, expect, it } from 'vitest';
import type { AlarmsMessage } from '../../../../src/adapters/mqtt/announcer.js';
import { MOST_FRONTS } from '../../../../src/adapters/mqtt/sparkplug/deviceMetrics.js';
import { OwnNode, type OwnNodeOptions } from '../../../../src/adapters/mqtt/sparkplug/ownNode.js';
import type { UnitDefinition } from '../../../../src/core/definitions.js';
import type { DispatchAnswer, Estimate } from '../../../../src/core/estimate.js';
import { encode } from './edge.js';
import { T0 } from './hostHarness.js';
import { StrictHost } from './strictHost.js';

const nodes: OwnNode[] = [];
afterEach(() => {
  for (const node of nodes.splice(0)) node.disconnected();
});

const unit = (id: string) =>
  ({ id, stores: [{ id: 'hot' }], hours_at_W: [1.8e6, 1.2e6] }) as unknown as UnitDefinition;
const front = (position_m: number) => ({
  ...{ position_m, position_sigma_m: 0.05, width_m: 1, width_sigma_m: null },
});
const estimate = (id: string, second: number, soc: number, fronts = 1) =>
  ({
    ...{ unit: id, time: new Date(T0 + second * 1000).toISOString(), mode: 'charge' },
    ...{ quality: 'good', state_of_charge: soc },
    stores: {
      hot: {
        ...{ soc, soc_sigma: 0.01, stored_MWh_th: 5, stored_sigma_MWh_th: 0.1 },
        ...{ energy_position_m: 2, fronts: Array.from({ length: fronts }, (_, i) => front(i + 1)) },
      },
    },
  }) as unknown as Estimate;
const quantiles = (p50: number) => ({ p90: p50 - 1, p50, p10: p50 + 1 });
const answer = (power_MW: number): DispatchAnswer => ({
  ...{ power_MW, hours: quantiles(4), energy_MWh_el: quantiles(7), ends_by: 'hot_outlet' },
});

function harness(changes: Partial<OwnNodeOptions> = {}) {
  const stale = new Set<string>();
  const counts: Record<string, number> = {};
  const node = new OwnNode({
    ...{ name: { group: 'Out', node: 'rockhour' }, units: [unit('u'), unit('v')] },
    ...{ site: 'Quarry Lane', version: '1.2.3' },
    now: () => T0,
    isStale: (id) => stale.has(id),
    count: (name) => {
      counts[name] = (counts[name] ?? 0) + 1;
    },
    ...changes,
  });
  nodes.push(node);
  const host = new StrictHost();
  const blocked: (() => void)[] = [];
  const line = { isBlocked: false };
  const outlet = {
    publish(topic: string, payload: Buffer, written: () => void) {
      host.receive(topic, payload);
      if (line.isBlocked) blocked.push(written);
      else written();
    },
  };
  const drain = () => {
    line.isBlocked = false;
    for (const written of blocked.splice(0)) written();
  };
  const kinds = () => host.heard.map(({ kind, device }) => (device ? `${kind} ${device}` : kind));
  return { node, host, outlet, stale, counts, line, drain, kinds };
}

describe('rockhour as an edge node', () => {
  it('is born with its number, then each unit that has data, with all metrics', () => {
    const { node, host, outlet, kinds } = harness();
    node.state(estimate('u', 0, 0.5, 2));
    node.dispatch('u', new Date(T0).toISOString(), [answer(1.8)]);
    const alarms = { unit: 'u', standing: [{ id: 'u/run_out/unit', class: 'alarm' }] };
    node.alarms(alarms as unknown as AlarmsMessage);
    node.connected(outlet, 7);
    expect(kinds()).toEqual(['NBIRTH', 'DBIRTH u']);
    expect(host.heard[0]).toMatchObject({
      ...{ bdSeq: 7 },
      values: { 'Properties/site': 'Quarry Lane', 'Properties/version': '1.2.3' },
    });
    expect(host.heard[1]!.values).toMatchObject({
      ...{ state_of_charge: 0.5, mode: 'charge', quality: 'good' },
      ...{ 'hot/soc': 0.5, 'hot/soc_sigma': 0.01, 'hot/stored_MWh_th': 5, 'hot/fronts': 2 },
      ...{ 'hot/front1/position_m': 1, 'hot/front1/width_m': 1, 'hot/front1/width_sigma_m': null },
      ...{ 'hot/front2/position_m': 2, 'hot/front3/position_m': null },
      ...{ 'at_1.8_MW_el/hours/p90': 3, 'at_1.8_MW_el/MWh_el/p10': 8 },
      ...{ 'at_1.8_MW_el/ends_by': 'hot_outlet', 'at_1.2_MW_el/hours/p50': null },
      ...{ 'alarms/standing': 1, 'alarms/alerts_standing': 0, 'alarms/ids': 'u/run_out/unit' },
    });
    expect(MOST_FRONTS).toBe(3);
    node.state(estimate('v', 0, 0.1));
    expect(kinds().at(-1)).toBe('DBIRTH v');
    expect(host.wrongs).toEqual([]);
  });

  it('tells changes alone, and nothing where nothing has changed', () => {
    const { node, host, outlet } = harness();
    node.state(estimate('u', 0, 0.5));
    node.connected(outlet, 0);
    node.state(estimate('u', 30, 0.5));
    expect(host.of('DDATA')).toEqual([]);
    node.state(estimate('u', 60, 0.6));
    node.dispatch('u', new Date(T0).toISOString(), [answer(1.2)]);
    expect(host.of('DDATA').map(({ values }) => Object.keys(values))).toEqual([
      ['state_of_charge', 'hot/soc'],
      [
        ...['p90', 'p50', 'p10'].map((q) => `at_1.2_MW_el/hours/${q}`),
        ...['p90', 'p50', 'p10'].map((q) => `at_1.2_MW_el/MWh_el/${q}`),
        'at_1.2_MW_el/ends_by',
      ],
    ]);
    for (let i = 0; i < 300; i++) node.state(estimate('u', 90 + i, 0.3 + (i % 2) / 10));
    expect(host.wrongs).toEqual([]);
  });

  it('lets a unit die while its data are stale, and be born again after', () => {
    const { node, outlet, stale, kinds, host } = harness();
    node.state(estimate('u', 0, 0.5));
    node.connected(outlet, 0);
    stale.add('u');
    node.tick();
    node.tick();
    node.state(estimate('u', 30, 0.5));
    stale.clear();
    node.tick();
    expect(kinds()).toEqual(['NBIRTH', 'DBIRTH u', 'DDEATH u', 'DBIRTH u']);
    expect(host.wrongs).toEqual([]);
  });

  it('says only the newest once a line that was blocked is free', () => {
    const { node, outlet, line, drain, host } = harness();
    node.state(estimate('u', 0, 0.5));
    node.connected(outlet, 0);
    line.isBlocked = true;
    for (let i = 1; i <= 1000; i++) node.state(estimate('u', 30 * i, 0.5 + i / 10_000));
    expect(host.of('DDATA')).toHaveLength(1);
    drain();
    expect(host.of('DDATA').map(({ values }) => values.state_of_charge)).toEqual([0.5001, 0.6]);
    expect(host.wrongs).toEqual([]);
  });

  it('keeps nothing but the newest while there is no connection', () => {
    const { node, outlet, host, kinds } = harness();
    node.connected(outlet, 0);
    node.disconnected();
    for (let i = 0; i < 1000; i++) node.state(estimate('u', 30 * i, i / 1000));
    node.connected(outlet, 1);
    expect(kinds()).toEqual(['NBIRTH', 'NBIRTH', 'DBIRTH u']);
    expect(host.heard.at(-1)!.values.state_of_charge).toBe(0.999);
  });

  it('is born again on request, many requests at once being one, and follows no other command', async () => {
    const { node, outlet, counts, host, kinds } = harness();
    node.state(estimate('u', 0, 0.5));
    node.connected(outlet, 3);
    const ask = (name: string, value: boolean) =>
      node.command(encode({ metrics: [{ name, type: 'Boolean', value }] }));
    for (let i = 0; i < 20; i++) ask('Node Control/Rebirth', true);
    ask('Node Control/Rebirth', false);
    ask('Node Control/Reboot', true);
    node.command(Buffer.from([1, 2, 3]));
    expect(counts.sparkplug_commands_refused).toBe(3);
    await expect.poll(() => kinds().length, { timeout: 5000 }).toBe(4);
    expect(kinds()).toEqual(['NBIRTH', 'DBIRTH u', 'NBIRTH', 'DBIRTH u']);
    expect(host.heard.map(({ bdSeq }) => bdSeq)).toEqual([3, null, 3, null]);
    expect(counts).toMatchObject({ sparkplug_own_births: 2, sparkplug_own_rebirths: 1 });
    expect(host.wrongs).toEqual([]);
  });
});
