import { describe, expect, it } from 'vitest';
import { tellingOf } from '../../../src/core/alarm/telling.js';
import type { RejectedSensor, SensorVerdict } from '../../../src/core/estimate.js';
import { sensorRaised } from '../../../src/core/watch/messages.js';

const since = '2026-01-31T06:00:30.000Z';
const WRITTEN = '2026-01-31 06:00:30 UTC';

describe('times in the sentences of alarms', () => {
  it.each<SensorVerdict>(['stuck', 'group_fault'])('are for people: %s', (verdict) => {
    const sensor: RejectedSensor = { id: 'hot.B.10', verdict, since, evidence: 'by 9 K' };
    const told = sensorRaised('hot', sensor);
    expect(told).toContain(`since ${WRITTEN};`);
    expect(told).not.toMatch(/\dT\d/);
  });

  it('are for people where an alarm is shown again', () => {
    const event = {
      ...{ id: 'u/valve_leaks/hot', unit: 'u', kind: 'valve_leaks', subject: 'hot' },
      ...{
        class: 'alert',
        priority: 'low',
        transition: 'raised',
        time: since,
        message: 'it leaks',
      },
    } as const;
    const transition = {
      ...{ what: 'unshelved', before: 'shelved', after: 'unacknowledged' },
      time_ms: Date.parse(since) + 60_000,
    } as const;
    const before = { state: 'shelved', told: true };
    const again = tellingOf(before as never, transition as never, event as never);
    expect(again?.message).toBe(
      `Shown again, as it was taken off the shelf; raised at ${WRITTEN}: it leaks`,
    );
    expect(again?.raised_at).toBe(since);
  });
});
