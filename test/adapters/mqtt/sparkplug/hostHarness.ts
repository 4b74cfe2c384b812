import { Intake, type IntakeReading } from '../../../../src/adapters/mqtt/intake.js';
import { SPARKPLUG_FATES } from '../../../../src/adapters/mqtt/sparkplug/counts.js';
import { SparkplugHost } from '../../../../src/adapters/mqtt/sparkplug/host.js';
import type { ChannelDefinition, UnitDefinition } from '../../../../src/core/definitions.js';
import { scanUnit } from '../../../core/scan/plant.js';
import type { Sent } from './edge.js';

/** Time of the first message [ms since 1970]. */
export const T0 = 1_769_839_200_000;

/** Channels tt and e by exception, p periodic, a valve and a mode, all at device Bed but the mode. */
export function edgeUnit(): UnitDefinition {
  const unit = scanUnit(30, ['p'], ['tt', 'e', 'valve', 'mode']);
  const roles: Record<string, ChannelDefinition['role']> = {
    valve: { kind: 'valve', opens: 'charge' },
    mode: { kind: 'mode' },
  };
  const channels = unit.channels.map((channel) => ({
    ...channel,
    role: roles[channel.id] ?? channel.role,
    raw_unit: channel.id === 'tt' ? 'degC' : channel.raw_unit,
  }));
  return { ...unit, channels } as unknown as UnitDefinition;
}

/** Intake and host with a journal in memory, a clock by hand and a list of requests. */
export function harness() {
  const rows: IntakeReading[] = [];
  const counts: Record<string, number> = {};
  const asked: { topic: string; payload: Buffer }[] = [];
  const clock = { ms: T0, steady: 0, isUp: true };
  const count = (name: string, by = 1) => {
    counts[name] = (counts[name] ?? 0) + by;
  };
  const units = [edgeUnit()];
  const at = { unit: 'u', group: 'Quarry', node: 'PLC1' };
  const host: SparkplugHost = new SparkplugHost({
    units,
    sources: [
      ...['p', 'tt', 'e', 'valve'].map((channel) => ({
        ...{ ...at, channel, device: 'Bed', metric: `Bed/${channel}` },
      })),
      { ...at, channel: 'mode', device: null, metric: 'Mode' },
    ],
    future_tolerance_ms: 300_000,
    now: () => clock.ms,
    steady: () => clock.steady,
    count,
    notice: () => undefined,
    command: (topic, payload) => {
      if (clock.isUp) asked.push({ topic, payload });
      return clock.isUp;
    },
    add: (readings) => intake.add(readings),
  });
  const intake: Intake = new Intake({
    ...{ units, sources: [], sparkplug: host },
    now: () => clock.ms,
    commit: (readings) => rows.push(...readings),
    count,
    unwanted: (topic) => count(`unwanted ${topic}`),
    notice: () => undefined,
  });
  const receive = (sent: Sent, changes: { retained?: boolean; duplicate?: boolean } = {}) => {
    intake.receive({ ...sent, duplicate: false, acknowledge: null, ...changes });
    intake.flush();
  };
  const taken = () => {
    intake.flush();
    return rows.splice(0);
  };
  /** What was written since the last time, as `channel@ms after T0=value quality`. */
  const news = () => {
    return taken().map(({ channel, time_ms, value, quality }) => {
      return `${channel}@${time_ms - T0}=${value} ${quality}`;
    });
  };
  const messages = () => SPARKPLUG_FATES.reduce((sum, name) => sum + (counts[name] ?? 0), 0);
  return { intake, host, counts, asked, clock, receive, taken, news, messages };
}
