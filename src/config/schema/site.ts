import { z } from 'zod';
import { alarmsSchema } from './alarms.js';
import { channelSchema, sparkplugSchema } from './channels.js';
import { id, key, positive, section } from './key.js';
import { lateSchema } from './late.js';
import { machineSchema } from './machine.js';
import { notifySchema } from './notify.js';
import { estimatorSchema, limitsSchema } from './operation.js';
import { httpSchema, influxSchema, localStoreSchema, mqttSchema } from './services.js';
import { storeSchema } from './store.js';
import { watchSchema } from './watch.js';

const power_MW = () => positive(5000);

/** One machine with its stores. */
export const unitSchema = z.strictObject({
  id: key(
    id(),
    '-',
    'Name of the unit, unique in the site; part of topics and addresses.',
    'unit1',
  ),
  name: key(z.string().min(1).max(120), '-', 'Name for people.', 'Unit 1', 'its id').optional(),
  scan_period_s: key(z.number().min(1).max(3600), 's', 'Spacing of the scans.', 30).default(30),
  rated_power_MW_el: key(
    power_MW(),
    'MW_el',
    'Rated power at the connection point while discharging.',
    1.8,
  ),
  rated_hours_h: key(positive(1000), 'h', 'Hours at rated power that the unit is sold for.', 6),
  ambient_degC: key(
    z.number().min(-70).max(65),
    'degC',
    'Ambient temperature where no channel measures it.',
    15,
  ).default(15),
  hours_at_MW_el: key(
    z.array(power_MW()).min(1).max(20),
    'MW_el',
    'Powers at which hours are computed without being asked.',
    [1.8, 1.2],
    'the rated power',
  ).optional(),
  hours_every_min: key(positive(1440), 'min', 'How often they are computed.', 10).default(10),
  sparkplug: section(
    sparkplugSchema,
    'Where metrics come from by Sparkplug, for all strings and channels that do not say otherwise.',
    'each says it',
  ),
  stores: section(
    z.array(section(storeSchema, 'A packed bed.')).min(1).max(2),
    'A hot store alone, or a hot and a cold one.',
  ),
  channels: section(
    z.array(section(channelSchema, 'A channel.')).max(500).default([]),
    'All channels but the thermocouples in the beds.',
  ),
  machine: section(machineSchema, 'The machine between grid and stores.'),
  limits: section(limitsSchema, 'Range of the machine and what ends a discharge or a charge.'),
  estimator: section(estimatorSchema.prefault({}), 'What the estimator may believe.'),
  watch: section(watchSchema.prefault({}), 'Limits of alarms and alerts.'),
});

/** A whole site file. Everything that concerns several keys at once is in crossChecks.ts. */
export const siteSchema = z.strictObject({
  name: key(z.string().min(1).max(120), '-', 'Name of the site.', 'Quarry Lane'),
  units: section(
    z.array(section(unitSchema, 'A unit.')).min(1).max(200),
    'Machines with their stores.',
  ),
  scan_deadline_s: key(
    z.number().min(0.1).max(3600),
    's',
    'How long after its nominal end a scan waits for missing readings.',
    10,
  ).default(10),
  clock_tolerance_s: key(
    z.number().min(1).max(86400),
    's',
    "A reading stamped further ahead of this machine's clock than this is counted and not used.",
    300,
  ).default(300),
  late: section(
    lateSchema.prefault({}),
    'Readings that come when their scan is closed, as from a gateway that has stored them.',
  ),
  mqtt: section(mqttSchema.prefault({}), 'Where the readings come from and the answers go.'),
  influx: section(
    influxSchema.optional(),
    'Time-series database; without this block the local store alone serves.',
  ),
  alarms: section(alarmsSchema.prefault({}), 'What may be done to alarms and alerts.'),
  notify: section(notifySchema.prefault({}), 'Who else is told of alarms and alerts.'),
  store: section(localStoreSchema.prefault({}), 'Local database files.'),
  http: section(httpSchema.prefault({}), 'Page and API.'),
});

export type SiteBlock = z.output<typeof siteSchema>;
export type UnitBlock = z.output<typeof unitSchema>;
