import { describe, expect, it } from 'vitest';
import { Announcer } from '../../../src/adapters/mqtt/announcer.js';
import type { WatchView } from '../../../src/core/watch/causes.js';
import type { IndicatorView } from '../../../src/core/watch/indicator.js';

const T = Date.UTC(2026, 0, 1);

function view(at_s: number, state: IndicatorView['state'], unit = 'u'): WatchView {
  const time = new Date(T + at_s * 1000).toISOString();
  return {
    ...{ time, unit, causes: [] },
    indicators: [
      {
        ...{ kind: 'spread_ratio', subject: 'hot', value: 1, sigma: 0.1, unit: '-' },
        ...{ healthy: 1, healthy_from: 'twin', limit: 1.3, deadband: 0.1, on_delay_s: 0 },
        ...{ off_delay_s: 0, score: 0, state, reason: null, time, sentence: 's' },
      },
    ],
  };
}

describe('what the announcer says of the watch', () => {
  it('once a minute of source time, and at once where a state changed or time went back', () => {
    const said: [string, WatchView][] = [];
    const outlet = {
      connected: true,
      publish: (topic: string, payload: string) => said.push([topic, JSON.parse(payload)]) > 0,
    };
    const announcer = new Announcer(outlet, {
      ...{ prefix: 'out', version: '0', site: 's', now: () => 0 },
    });
    for (let at_s = 0; at_s <= 300; at_s += 10) announcer.watch(view(at_s, 'normal'));
    announcer.watch(view(310, 'degraded'));
    announcer.watch(view(320, 'degraded'));
    announcer.watch(view(325, 'normal', 'v'));
    announcer.watch(view(330, 'normal'));
    announcer.watch(view(100, 'normal'));
    const seconds = said.map(([topic, { time }]) => [topic, (Date.parse(time) - T) / 1000]);
    expect(seconds).toEqual([
      ...[0, 60, 120, 180, 240, 300, 310].map((at_s) => ['out/u/watch', at_s]),
      ['out/v/watch', 325],
      ['out/u/watch', 330],
      ['out/u/watch', 100],
    ]);
  });
});
