import type { ChannelSource, SiteConfig } from '../../src/config/site.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { scanUnit } from '../core/scan/plant.js';
import { temporaryFolder } from '../support/folders.js';

export const PERIOD_MS = 30_000;

const RANGE = { power_min_W: 0, power_max_W: 2e6, flow_min_kg_s: 0, flow_max_kg_s: 10 };

/** A unit with channels a, b, c and, by exception, e: as much of one as the daemon itself needs. */
export function smallUnit(id = 'u'): UnitDefinition {
  return {
    ...scanUnit(PERIOD_MS / 1000),
    id,
    name: id,
    stores: [],
    hours_at_W: [1e6],
    hours_every_s: 600,
    machine: { auxiliary_running_W: 0, auxiliary_standing_W: 0 },
    limits: { charge: RANGE, discharge: RANGE },
    watch: {
      data_age_s: { limit: 120, deadband: 0, on_delay_s: 0, off_delay_s: 0 },
      database_down: { on_delay_s: 1, off_delay_s: 1 },
    },
  } as unknown as UnitDefinition;
}

/** `IN/a` is one value a message, `IN/bc` an array, `IN/e` the channel by exception. */
export function smallSite(
  mqttUrl: string | null,
  changes: Partial<SiteConfig> & { readonly folder?: string } = {},
): SiteConfig {
  const { folder = temporaryFolder('daemon'), ...rest } = changes;
  const source = (name: string, ...channels: string[]): ChannelSource => ({
    unit: 'u',
    topic: `in/${name}`,
    payload: channels.length > 1 ? 'array' : 'value',
    channels,
  });
  return {
    name: 'Small site',
    units: [smallUnit()],
    sources: [source('a', 'a'), source('bc', 'b', 'c'), source('e', 'e')],
    scan_deadline_s: 10,
    mqtt: {
      url: mqttUrl,
      embedded_host: '127.0.0.1',
      embedded_port: 0,
      client_id: 'rockhour-test',
      username: null,
      password: null,
      protocol: 4,
      qos: 1,
      out_prefix: 'out',
    },
    influx: null,
    store: {
      folder,
      keep_readings_days: 30,
      keep_estimates_days: 365,
      thin_after_days: 30,
      thin_to_s: 600,
      checkpoint_every_s: 600,
    },
    http: { host: '127.0.0.1', port: 0, path_prefix: '' },
    ...rest,
  };
}
