import { resolve as resolvePath } from 'node:path';
import type { UnitDefinition } from '../core/definitions.js';
import { ZERO_CELSIUS_K } from '../core/units.js';
import { channelTopic, expandString } from './expand.js';
import { sparkplugSources } from './expandSparkplug.js';
import { resolveChannels } from './resolveChannels.js';
import {
  resolveEstimator,
  resolveLimits,
  resolveMachine,
  resolveWatch,
} from './resolveOperation.js';
import { resolveStore } from './resolveStore.js';
import type { NotifyBlock } from './schema/notify.js';
import type { SiteBlock, UnitBlock } from './schema/site.js';
import type { Secrets } from './secrets.js';
import type { ChannelSource, SiteConfig, WebhookConfig } from './site.js';

/** A sound site block becomes SI units and kelvin; every conversion of the file happens here. */
export function resolveSite(site: SiteBlock, baseFolder: string, secrets: Secrets): SiteConfig {
  const { mqtt, influx, alarms, notify, store, http } = site;
  return {
    name: site.name,
    units: site.units.map(resolveUnit),
    sources: site.units.flatMap((unit) => sourcesOf(unit, mqtt.in_prefix)),
    sparkplug: site.units.flatMap((unit) => sparkplugSources(unit).sources),
    scan_deadline_s: site.scan_deadline_s,
    clock_tolerance_s: site.clock_tolerance_s,
    late: site.late,
    mqtt: {
      url: mqtt.url ?? null,
      embedded_host: mqtt.embedded_host,
      embedded_port: mqtt.embedded_port,
      embedded_tls: secrets.embedded_tls,
      embedded_packet_max_bytes: mqtt.embedded_packet_max_kB * 1000,
      embedded_memory_max_bytes: mqtt.embedded_memory_max_MB * 1e6,
      client_id: mqtt.client_id,
      username: mqtt.username ?? null,
      password: secrets.mqtt,
      protocol: mqtt.protocol,
      qos: mqtt.qos,
      out_prefix: mqtt.out_prefix,
      tls: secrets.mqtt_tls,
      sparkplug_node: mqtt.sparkplug_node ?? null,
    },
    influx:
      influx === undefined
        ? null
        : {
            url: influx.url,
            database: influx.database,
            username: influx.username ?? null,
            password: secrets.influx,
            batch_points: influx.batch_points,
            tls: secrets.influx_tls,
          },
    alarms,
    notify: { webhooks: notify.webhooks.map((webhook) => resolveWebhook(webhook, secrets)) },
    store: { ...store, folder: resolvePath(baseFolder, store.folder) },
    http: {
      host: http.host,
      port: http.port,
      path_prefix: http.path_prefix,
      tokens: [...http.tokens, ...secrets.tokens],
      tokens_inline: http.tokens,
      tokens_file:
        http.tokens_file === undefined ? null : resolvePath(baseFolder, http.tokens_file),
      login_by_proxy: http.login_by_proxy,
      tls: secrets.http_tls,
    },
    secret_files: secrets.files,
  };
}

function resolveUnit(unit: UnitBlock): UnitDefinition {
  return {
    id: unit.id,
    name: unit.name ?? unit.id,
    scan_period_s: unit.scan_period_s,
    rated_power_W: unit.rated_power_MW_el * 1e6,
    rated_hours: unit.rated_hours_h,
    ambient_K: unit.ambient_degC + ZERO_CELSIUS_K,
    stores: unit.stores.map(resolveStore),
    channels: resolveChannels(unit),
    machine: resolveMachine(unit.machine),
    limits: resolveLimits(unit.limits, unit.machine.auxiliary_standing_kW * 1e3),
    estimator: resolveEstimator(unit),
    watch: resolveWatch(unit),
    hours_at_W: (unit.hours_at_MW_el ?? [unit.rated_power_MW_el]).map((power) => power * 1e6),
    hours_every_s: unit.hours_every_min * 60,
  };
}

function sourcesOf(unit: UnitBlock, inPrefix: string): ChannelSource[] {
  const strings = unit.stores.flatMap((store) =>
    store.strings.flatMap((string): ChannelSource[] => {
      const { ids, topics } = expandString(unit.id, store, string, inPrefix);
      if (string.payload === 'sparkplug') return [];
      if (string.payload === 'array') {
        return [{ unit: unit.id, topic: topics[0]!, payload: 'array', channels: ids }];
      }
      return ids.map((channel, i) => ({
        unit: unit.id,
        topic: topics[i]!,
        payload: 'value',
        channels: [channel],
      }));
    }),
  );
  const others = unit.channels
    .filter(({ payload }) => payload === 'value')
    .map(
      (channel): ChannelSource => ({
        unit: unit.id,
        topic: channelTopic(unit, channel, inPrefix),
        payload: 'value',
        channels: [channel.id],
      }),
    );
  return [...strings, ...others];
}

function resolveWebhook(
  { id, url, send, least_priority, timeout_s, oldest_h }: NotifyBlock['webhooks'][number],
  { webhooks, webhooks_tls }: Secrets,
): WebhookConfig {
  const secret = webhooks[id] ?? null;
  const tls = webhooks_tls[id] ?? null;
  return { id, url, secret, tls, send, least_priority, timeout_s, oldest_h };
}
