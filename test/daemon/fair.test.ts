import { describe, expect, it } from 'vitest';
import type { ChannelSource } from '../../src/config/site.js';
import type { Core } from '../../src/daemon/core.js';
import { waitFor } from '../support/wait.js';
import { fakeCore } from './fakeCore.js';
import { counted, makeDaemon, publish, publisher } from './harness.js';
import { PERIOD_MS, smallSite, smallUnit } from './site.js';

/** Units `u` and `v`, each with its own topics. */
function twoUnits() {
  const sources = ['u', 'v'].flatMap((unit): ChannelSource[] => [
    { unit, topic: `in/${unit}/a`, payload: 'value', channels: ['a'] },
    { unit, topic: `in/${unit}/bc`, payload: 'array', channels: ['b', 'c'] },
  ]);
  return smallSite(null, { units: [smallUnit('u'), smallUnit('v')], sources });
}

/** A scan costs as much as one of a real unit. */
function slowCore(cost_ms: number): Core {
  return {
    ...fakeCore,
    advance: (...ask) => {
      const end = performance.now() + cost_ms;
      while (performance.now() < end);
      return fakeCore.advance(...ask);
    },
  };
}

const NOW_MS = Math.floor(Date.now() / PERIOD_MS) * PERIOD_MS;

describe('one unit among others', () => {
  it('that brings a night at once lets the others have their scans in time', async () => {
    const daemon = makeDaemon(twoUnits(), { core: slowCore(4) });
    const { broker } = await daemon.start();
    const client = await publisher(broker);
    const scan = (unit: string, index: number) => {
      const time = NOW_MS + index * PERIOD_MS;
      return [
        publish(client, `in/${unit}/a`, { time, value: 1 + (index % 7) }),
        publish(client, `in/${unit}/bc`, { time, values: [2, 3] }),
      ];
    };
    await Promise.all([...scan('u', -500), ...scan('v', -500)]);
    await counted(daemon, 'scans', 2);
    // 490 scans of 4 ms are two seconds of work; those of the other come while it is done.
    const flood = Array.from({ length: 490 }, (_, i) => scan('u', i - 499)).flat();
    await Promise.all(flood);
    for (const index of [-499, -498]) {
      await Promise.all(scan('v', index));
      const time = new Date(NOW_MS + index * PERIOD_MS).toISOString();
      await waitFor('its scan', () => daemon.service.now('v')?.estimate?.time === time);
      // What came before it of the other still waits.
      expect(daemon.service.backlogs().pipeline).toBeGreaterThan(100);
    }
    await counted(daemon, 'scans', 2 + 490 + 2, 30_000);
  });

  it('whose core fails at each scan costs the others nothing and is told', async () => {
    const core: Core = {
      ...fakeCore,
      advance: (unit, ...ask) => {
        if (unit.id === 'u') throw new RangeError('no such rock');
        return fakeCore.advance(unit, ...ask);
      },
    };
    const daemon = makeDaemon(twoUnits(), { core });
    const { broker } = await daemon.start();
    const client = await publisher(broker);
    for (let index = -5; index < 0; index++) {
      const time = NOW_MS + index * PERIOD_MS;
      for (const unit of ['u', 'v']) {
        await publish(client, `in/${unit}/a`, { time, value: 1 });
        await publish(client, `in/${unit}/bc`, { time, values: [2, 3] });
      }
    }
    await counted(daemon, 'scan_failures', 5);
    await counted(daemon, 'scans', 5);
    const parts = daemon.service.health();
    expect(parts).toContainEqual({
      ...{ name: 'unit u', ok: false, detail: 'the last scan failed: no such rock' },
    });
    expect(daemon.service.now('v')?.estimate?.time).toBe(
      new Date(NOW_MS - PERIOD_MS).toISOString(),
    );
  });
});
