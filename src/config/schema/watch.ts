import { z } from 'zod';
import { INDICATOR_DEFAULTS, INDICATORS_DEFAULT } from '../../core/watch/rules.js';
import { key, positive, section, share, worded } from './key.js';

const delays = (on_s: number, off_s: number) => ({
  on_delay_s: key(
    z.number().min(0).max(86400),
    's',
    'How long the condition must last before it is raised.',
    on_s,
  ).default(on_s),
  off_delay_s: key(
    z.number().min(0).max(86400),
    's',
    'How long it must be gone before it returns.',
    off_s,
  ).default(off_s),
});

type Kind = Exclude<keyof typeof INDICATOR_DEFAULTS, 'spread_ratio'>;

/** How an indicator decides; `deadband` is held against `limit` in crossChecks/watch.ts. */
const indicator = (kind: Kind, limit: z.ZodNumber) => {
  const shipped = INDICATOR_DEFAULTS[kind];
  const words = `${shipped.words[0]?.toUpperCase()}${shipped.words.slice(1)}.`;
  return section(
    z
      .strictObject({
        limit: key(limit, shipped.unit, words, shipped.limit).default(shipped.limit),
        deadband: key(
          z.number().min(0).max(1000),
          shipped.unit,
          'How far back from the limit counts as healthy again.',
          shipped.deadband,
        ).default(shipped.deadband),
        ...delays(shipped.on_delay_s, shipped.off_delay_s),
      })
      .prefault({}),
    words,
  );
};

const above1 = () => z.number().gt(1).max(20);
const below1 = () => z.number().gt(0).lt(1);

/** What is followed over weeks; the front's width has its own block, spread_ratio. */
const indicatorsSchema = z.strictObject({
  in_control_days: key(
    z.number().min(1).max(1e6),
    'd',
    'Mean time to a false decision of one healthy indicator, at least.',
    INDICATORS_DEFAULT.in_control_d,
  ).default(INDICATORS_DEFAULT.in_control_d),
  baseline_from: key(
    worded(
      z.iso.datetime({ offset: true }),
      'a time in ISO 8601 with its offset, in quotation marks',
    ),
    'ISO 8601',
    'What is healthy is learned from here on: after an overhaul, set it to when that was over.',
    '2027-03-05T18:00:00+01:00',
    'the first readings',
  ).optional(),
  heat_transfer: indicator('heat_transfer', below1()),
  string_flow: indicator('string_flow', below1()),
  front_travel: indicator('front_travel', below1()),
  standing_loss: indicator('standing_loss', above1()),
  valve_leak: indicator('valve_leak', below1()),
  pressure_drop: indicator('pressure_drop', above1()),
  plateau: indicator('plateau', positive(200)),
  gas_inventory: indicator('gas_inventory', below1()),
  settling: indicator('settling', positive(10)),
  store_mismatch: indicator('store_mismatch', below1()),
  front_view: indicator('front_view', positive(100)),
  energy_lost: indicator('energy_lost', below1()),
  sensor_health: indicator('sensor_health', below1()),
});

/** Limits of alarms and alerts, and how indicators decide. */
export const watchSchema = z.strictObject({
  spread_ratio: section(
    z
      .strictObject({
        limit: key(
          z.number().min(1).max(20),
          '-',
          'Alert where the front is this many times wider than a healthy bed would show.',
          1.3,
        ).default(1.3),
        deadband: key(share(), '-', 'It returns this far below the limit.', 0.1).default(0.1),
        ...delays(900, 1800),
      })
      .prefault({}),
    'A front that is wider than it should be.',
  ),
  outlet_margin_K: section(
    z
      .strictObject({
        limit: key(
          z.number().min(0).max(500),
          'K',
          'Alarm where an outlet is this close to the limit that stops the discharge.',
          15,
        ).default(15),
        deadband: key(
          z.number().min(0).max(200),
          'K',
          'It returns this far beyond the limit.',
          5,
        ).default(5),
        ...delays(60, 120),
      })
      .prefault({}),
    'An outlet close to its stop limit.',
  ),
  data_age_s: section(
    z
      .strictObject({
        limit: key(
          positive(86400),
          's',
          'Alarm where the newest reading is older.',
          150,
          'five scan periods',
        ).optional(),
        deadband: key(
          z.number().min(0).max(86400),
          's',
          'It returns this far below the limit.',
          30,
        ).default(0),
        ...delays(0, 0),
      })
      .prefault({}),
    'Readings that no longer come.',
  ),
  sensor_rejected: section(
    z.strictObject(delays(300, 900)).prefault({}),
    'A sensor that is not believed.',
  ),
  database_down: section(
    z.strictObject(delays(60, 60)).prefault({}),
    'A time-series database that does not answer.',
  ),
  indicators: section(
    indicatorsSchema.prefault({}),
    'What is followed over weeks, so that maintenance learns early what degrades.',
  ),
});

export type WatchBlock = z.output<typeof watchSchema>;
