import { z } from 'zod';
import type { RawUnit } from '../../core/units.js';
import { id, key, section, temperature_degC, worded } from './key.js';
import {
  FLOW_UNITS,
  POWER_UNITS,
  PRESSURE_UNITS,
  TEMPERATURE_UNITS,
  THERMOCOUPLE_TYPES,
  VALVE_UNITS,
} from './quantities.js';

/** Topics are written out in full: a wildcard would join channels that are not the same. */
export const topic = () =>
  worded(
    z
      .string()
      .min(1)
      .max(256)
      .regex(/^[^+#\s]+$/),
    'a topic without spaces, + and #',
  );

const periodic = z.strictObject({
  kind: key(
    z.literal('periodic'),
    '-',
    'Every scan brings a value; silence is a missing value.',
    'periodic',
  ),
});
const byException = z.strictObject({
  kind: key(
    z.literal('by_exception'),
    '-',
    'A value comes only when it has changed.',
    'by_exception',
  ),
  deadband: key(
    z.number().min(0),
    'unit of the channel',
    'Change that the source lets pass without a message; in the unit of the channel (degC for mV).',
    0.5,
  ),
  longest_silence_s: key(
    z.number().gt(0).max(86400),
    's',
    'The source speaks at least this often; longer silence means a missing value.',
    600,
  ),
});
export const reporting = section(
  z.discriminatedUnion('kind', [periodic, byException]).optional(),
  'How the source reports: at its period, or by exception with a deadband (a silent channel is then held).',
  'periodic; for payload sparkplug by exception, with deadband 0 and a silence of a day',
);

/** Parts of a Sparkplug topic: MQTT's own signs would make other topics of them. */
const sparkplugName = () =>
  worded(
    z
      .string()
      .min(1)
      .max(128)
      .regex(/^[^+#/\p{Cc}]+$/u),
    'a name without +, # and /',
  );
/** A nearer block goes before a wider one. */
const ofUnit = "the unit's; needed there or here";
/** Where the metrics of a unit, a string or a channel are. */
export const sparkplugSchema = section(
  z
    .strictObject({
      group: key(
        sparkplugName(),
        '-',
        'Sparkplug group of the edge node.',
        'Quarry',
        ofUnit,
      ).optional(),
      node: key(sparkplugName(), '-', 'Edge node.', 'PLC1', ofUnit).optional(),
      device: key(
        sparkplugName(),
        '-',
        'Device at the edge node that has the metrics.',
        'Stores',
        "the unit's, else metrics are those of the edge node itself",
      ).optional(),
    })
    .optional(),
  'Where its metrics come from, for payload sparkplug.',
  'that of the unit',
);
/** An edge node of rockhour's own. */
export const sparkplugNodeSchema = z.strictObject({
  group: key(sparkplugName(), '-', 'Group of rockhour as an edge node.', 'Quarry'),
  node: key(sparkplugName(), '-', 'Name of rockhour as an edge node.', 'rockhour'),
});
const metricName = () => z.string().min(1).max(256);

const thermocoupleUnit = {
  unit: key(
    z.enum([...TEMPERATURE_UNITS, 'mV']),
    '-',
    'Unit of the raw values; mV needs thermocouple_type and a cold junction.',
    'degC',
  ).default('degC'),
  thermocouple_type: key(
    z.enum(THERMOCOUPLE_TYPES),
    '-',
    'Letter of IEC 60584-1; needed where the unit is mV.',
    'K',
    'none',
  ).optional(),
  cold_junction: key(
    id(),
    '-',
    'Id of the channel that measures the cold junction; for mV.',
    'card1_junction',
    'none',
  ).optional(),
  cold_junction_degC: key(
    temperature_degC(),
    'degC',
    'Fixed temperature of the cold junction; for mV without a channel of its own.',
    25,
    'none',
  ).optional(),
};

/** A line of thermocouples; every one becomes a channel. */
export const stringSchema = z.strictObject({
  id: key(id(), '-', 'Name of the string, unique in its store.', 'axis'),
  radius_m: key(z.number().min(0).max(100), 'm', 'Distance from the axis of the bed.', 0.5),
  area_share: key(
    z.number().gt(0).max(1),
    '-',
    'Share of the cross-section for which the string stands. Give it for all strings of a store or for none.',
    0.34,
    'the ring between the mid-radii to its neighbours',
  ).optional(),
  positions_m: key(
    z.array(z.number().min(0).max(200)).min(1).max(400),
    'm',
    'Positions of the thermocouples, running in one direction, counted from `measured_from`.',
    [0.25, 0.75, 1.25],
  ),
  measured_from: key(
    z.enum(['charge_inlet', 'top', 'bottom']),
    '-',
    'Where positions_m counts from.',
    'bottom',
  ).default('charge_inlet'),
  ids: key(
    z.union([z.string().min(1).max(80), z.array(id()).min(1).max(400)]),
    '-',
    'Channel ids: a list, one for each position, or a pattern with {store}, {string} and {n} (01, 02, ...).',
    'TT_{store}_{string}_{n}',
  ).default('{store}_{string}_{n}'),
  payload: key(
    z.enum(['value', 'array', 'sparkplug']),
    '-',
    'array: one message carries the readings of the string in the order of positions_m; value: one message per thermocouple; sparkplug: metrics of an edge node.',
    'array',
  ).default('array'),
  metric: key(
    z.union([metricName(), z.array(metricName()).min(1).max(400)]),
    '-',
    'Metrics of the thermocouples, for payload sparkplug: a list, one for each position, or a pattern with {id}, {store}, {string} and {n}.',
    'Hot/Axis/TT{n}',
    'the channel ids',
  ).optional(),
  sparkplug: sparkplugSchema,
  topic: key(
    topic(),
    '-',
    'Topic of the string; for payload value with {id} or {n} in it.',
    'plant/unit1/hot/axis',
    '<mqtt.in_prefix>/<unit>/<store>/<string>, and /{id} for payload value',
  ).optional(),
  group: key(
    z.string().min(1).max(80),
    '-',
    'Name of the card, cable or cold junction that these thermocouples share, for common faults.',
    'card1',
    'the string is a group of its own',
  ).optional(),
  ...thermocoupleUnit,
  reporting,
});

const channelBasics = {
  id: key(id(), '-', 'Name of the channel: also its column in a recording.', 'flow'),
  topic: key(
    topic(),
    '-',
    'Topic of the channel.',
    'plant/unit1/flow',
    '<mqtt.in_prefix>/<unit>/<channel id>',
  ).optional(),
  payload: key(
    z.enum(['value', 'sparkplug']),
    '-',
    'value: a message per reading; sparkplug: a metric of an edge node.',
    'value',
  ).default('value'),
  metric: key(
    metricName(),
    '-',
    'Metric of the channel, for payload sparkplug.',
    'Loop/Flow',
    'the id of the channel',
  ).optional(),
  sparkplug: sparkplugSchema,
  reporting,
};
const measures = <T extends string>(word: T, what: string) => key(z.literal(word), '-', what, word);
const store = key(id(), '-', 'Id of the store that it belongs to.', 'hot');
const unitOf = (units: readonly RawUnit[], usual: RawUnit) =>
  key(z.enum(units), '-', 'Unit of the raw values.', usual).default(usual);

/** All channels but the thermocouples in the bed, told apart by what they measure. */
export const channelSchema = z.discriminatedUnion('measures', [
  z.strictObject({
    measures: measures('flow', 'Mass flow of the gas or liquid through the stores.'),
    ...channelBasics,
    sense: key(
      z.enum(['signed', 'unsigned', 'charge', 'discharge']),
      '-',
      'signed: positive while charging; unsigned: needs a mode; charge or discharge: a meter per direction.',
      'signed',
    ).default('signed'),
    unit: unitOf(FLOW_UNITS, 'kg/s'),
  }),
  z.strictObject({
    measures: measures('gas_temperature', 'Gas temperature at one end of a store.'),
    ...channelBasics,
    store,
    end: key(
      z.enum(['charge_inlet', 'discharge_inlet']),
      '-',
      'charge_inlet is x = 0, where gas enters while charging; discharge_inlet is the other end.',
      'charge_inlet',
    ),
    ...thermocoupleUnit,
  }),
  z.strictObject({
    measures: measures('mode', 'Mode from the plant: 1 or charge, 0 or stand, -1 or discharge.'),
    ...channelBasics,
  }),
  z.strictObject({
    measures: measures(
      'valve',
      'A valve that is open in one direction and closed else: 1, open or true; 0, closed or false; or percent open.',
    ),
    ...channelBasics,
    opens: key(
      z.enum(['charge', 'discharge']),
      '-',
      'Direction in which the valve is open.',
      'charge',
    ),
    unit: unitOf(VALVE_UNITS, 'open'),
  }),
  z.strictObject({
    measures: measures(
      'power',
      'Net power at the connection point: positive while charging, negative while discharging.',
    ),
    ...channelBasics,
    unit: unitOf(POWER_UNITS, 'MW'),
  }),
  z.strictObject({
    measures: measures('auxiliary_power', 'Power of the auxiliaries.'),
    ...channelBasics,
    unit: unitOf(POWER_UNITS, 'kW'),
  }),
  z.strictObject({
    measures: measures('ambient_temperature', 'Ambient temperature.'),
    ...channelBasics,
    ...thermocoupleUnit,
  }),
  z.strictObject({
    measures: measures('pressure', 'Absolute gas pressure of a store.'),
    ...channelBasics,
    store,
    unit: unitOf(PRESSURE_UNITS, 'bar'),
  }),
  z.strictObject({
    measures: measures('pressure_drop', 'Pressure drop over a store.'),
    ...channelBasics,
    store,
    unit: unitOf(PRESSURE_UNITS, 'kPa'),
  }),
  z.strictObject({
    measures: measures('shell_temperature', 'Temperature of the shell of a store.'),
    ...channelBasics,
    store,
    position_m: key(z.number().min(0).max(200), 'm', 'Distance from the charge inlet.', 2),
    ...thermocoupleUnit,
  }),
  z.strictObject({
    measures: measures('cold_junction', 'Temperature of a cold junction.'),
    ...channelBasics,
    group: key(z.string().min(1).max(80), '-', 'Group of thermocouples that it serves.', 'card1'),
    unit: unitOf(TEMPERATURE_UNITS, 'degC'),
  }),
]);

export type StringBlock = z.output<typeof stringSchema>;
export type ChannelBlock = z.output<typeof channelSchema>;
