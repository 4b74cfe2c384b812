import { describe, expect, it } from 'vitest';
import { AlarmCommands } from '../../../src/adapters/mqtt/alarmCommands.js';
import type { Delivery } from '../../../src/adapters/mqtt/link.js';
import { RockhourError } from '../../../src/errors.js';

function made(change: Partial<ConstructorParameters<typeof AlarmCommands>[0]> = {}) {
  const done: string[] = [];
  const followed: unknown[] = [];
  const commands = new AlarmCommands({
    ...{ prefix: 'rockhour', units: ['u', 'v'], now: () => 0 },
    follow: (command, unit) => {
      followed.push([unit, command]);
      done.push('followed');
      return { accepted: true, state: 'normal' };
    },
    answer: (topic, payload) => {
      const { accepted, fault } = JSON.parse(payload);
      done.push(`${topic} ${accepted ? 'accepted' : fault.expected}`);
      return true;
    },
    malformed: (text) => done.push(`malformed: ${text}`),
    lost: () => done.push('lost'),
    ...change,
  });
  const deliver = (topic: string, text: string, more: Partial<Delivery> = {}) =>
    commands.receive({
      ...{ topic, payload: Buffer.from(text), duplicate: false },
      acknowledge: () => void done.push('acknowledged'),
      ...more,
    });
  return { commands, done, followed, deliver };
}

describe('alarm commands over MQTT', () => {
  it('have one topic per unit, and leave every other message alone', () => {
    const { commands, deliver, done } = made();
    expect(commands.topics).toEqual(['rockhour/u/alarms/command', 'rockhour/v/alarms/command']);
    expect(deliver('rockhour/w/alarms/command', '{}')).toBe(false);
    expect(deliver('plant/u/flow', '{}')).toBe(false);
    expect(done).toEqual([]);
  });

  it('are followed, answered, and only then acknowledged', () => {
    const { deliver, done, followed } = made();
    expect(deliver('rockhour/v/alarms/command', '{"id": 1}')).toBe(true);
    expect(done).toEqual(['followed', 'rockhour/v/alarms/answer accepted', 'acknowledged']);
    expect(followed).toEqual([['v', { id: 1 }]]);
  });

  it('that the broker kept are refused, as it would hand them out at each connection; an empty one is none', () => {
    const { deliver, done, followed } = made();
    deliver('rockhour/u/alarms/command', '{"id": 1}', { retained: true });
    expect(done).toEqual([
      'malformed: alarm command for unit u: {"id": 1}',
      'rockhour/u/alarms/answer a message that is not retained',
      'acknowledged',
    ]);
    done.length = 0;
    deliver('rockhour/u/alarms/command', '', { retained: true });
    expect(done).toEqual(['acknowledged']);
    expect(followed).toEqual([]);
  });

  it('say so where the disk does not take them, and count an answer that cannot be sent', () => {
    const { deliver, done } = made({
      follow: () => {
        throw new RockhourError('STORE_FAILED', 'disk full');
      },
    });
    deliver('rockhour/u/alarms/command', '{}');
    expect(done).toEqual([
      'rockhour/u/alarms/answer a disk that takes it: disk full',
      'acknowledged',
    ]);
    const broken = made({
      follow: () => {
        throw new RangeError('time_ms must be finite');
      },
    });
    broken.deliver('rockhour/u/alarms/command', '{}');
    expect(broken.done[0]).toMatch(/answer no fault of rockhour: .*time_ms must be finite/);
    const other = made({ answer: () => false });
    other.deliver('rockhour/u/alarms/command', '{}');
    expect(other.done).toEqual(['followed', 'lost', 'acknowledged']);
  });
});
