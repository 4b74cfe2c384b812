import { z } from 'zod';
import { key, positive, section, worded } from './key.js';

const ramp = (direction: string, example: number) =>
  key(
    positive(5000),
    'MW_el/min',
    `Greatest change of net power while ${direction}, upwards and downwards.`,
    example,
    'at once',
  ).optional();

const startUp = (time_min: number, energy_kWh_el: number) => ({
  time_min: key(
    z.number().min(0).max(2880),
    'min',
    'From the command to the first power.',
    time_min,
  ),
  energy_kWh_el: key(
    z.number().min(0).max(1e6),
    'kWh_el',
    'Drawn from the grid over that time, the standing auxiliaries included.',
    energy_kWh_el,
    'what the standing auxiliaries draw',
  ).optional(),
});

/** How fast the machine follows a command. */
const operation = z.strictObject({
  ramp_MW_per_min: section(
    z
      .strictObject({ charge: ramp('charging', 0.4), discharge: ramp('discharging', 0.3) })
      .prefault({}),
    'How fast power may change.',
  ),
  start: section(
    z
      .strictObject({
        warm: section(z.strictObject(startUp(6, 8)), 'After a short stand.', 'at once').optional(),
        cold: section(z.strictObject(startUp(20, 40)), 'After a long stand.', 'as warm').optional(),
        cold_after_h: key(
          positive(1000),
          'h',
          'A machine that stood longer than this starts cold.',
          12,
          'it never does',
        ).optional(),
      })
      .prefault({}),
    'What a start-up takes.',
  ),
  change_over_min: key(
    z.number().min(0).max(2880),
    'min',
    'From the end of one direction to the start-up of the other.',
    10,
  ).default(0),
});

/** `24:00` is the end of the day, which `00:00` of the next would say as well. */
const CLOCK = /^(?:(?:[01]\d|2[0-3]):[0-5]\d|24:00)$/;
const clock = (what: string, example: string) =>
  key(
    worded(
      z.string().regex(CLOCK),
      'a time of day in quotation marks, hours and minutes of two digits each',
    ),
    'local time',
    what,
    example,
  );
const power = (what: string, example: number) =>
  key(z.number().min(0).max(5000), 'MW_el', what, example);

const connection = z.strictObject({
  time_zone: key(
    worded(z.string().min(1).max(64), 'the IANA name of a time zone'),
    '-',
    'Zone in which windows are meant and blocks are written; its days have 23, 24 or 25 hours.',
    'Europe/Berlin',
  ),
  export_max_MW_el: power('Greatest power that may be given to the grid.', 2),
  import_max_MW_el: power('Greatest power that may be taken from it.', 3.8),
  windows: section(
    z
      .array(
        section(
          z.strictObject({
            from: clock('When the window opens, every day.', '17:00'),
            to: clock('When it closes; not later than from: on the next day.', '20:00'),
            export_max_MW_el: key(
              z.number().min(0).max(5000),
              'MW_el',
              'Greatest power that may be given meanwhile.',
              2,
              'that of the connection',
            ).optional(),
            import_max_MW_el: key(
              z.number().min(0).max(5000),
              'MW_el',
              'Greatest power that may be taken meanwhile.',
              1.5,
              'that of the connection',
            ).optional(),
          }),
          'A time of day with limits of its own.',
        ),
      )
      .max(96)
      .default([]),
    'Times of day in which less may be given or taken.',
  ),
});

const instant = (what: string, example: string) =>
  key(
    worded(
      z.iso.datetime({ offset: true }),
      'a time in ISO 8601 with its offset, in quotation marks',
    ),
    'ISO 8601',
    what,
    example,
  );
const left = (what: string) =>
  key(z.number().min(0).max(5000), 'MW_el', what, 0, '0, that direction is out').default(0);

const outage = z.strictObject({
  from: instant('When it begins.', '2027-03-01T06:00:00+01:00'),
  to: instant('When it ends.', '2027-03-05T18:00:00+01:00'),
  discharge_max_MW_el: left('Greatest power that can be given meanwhile.'),
  charge_max_MW_el: left('Greatest power that can be taken meanwhile.'),
  reason: key(z.string().min(1).max(200), '-', 'Why; told in answers.', 'overhaul of the turbine'),
});

/** What binds what the unit can sell, beside the stores; keys of `limits`. */
export const tradeLimits = {
  operation: section(
    operation,
    'How fast the machine follows a command.',
    'everything at once',
  ).optional(),
  connection: section(
    connection,
    'What the grid connection lets through.',
    'no limit, blocks in UTC',
  ).optional(),
  outages: section(
    z.array(section(outage, 'An outage.')).max(200).default([]),
    'Planned times in which the unit can give or take less, or nothing.',
  ),
  availability: key(
    z.number().gt(0).max(1),
    '-',
    'Share of the time, planned outages aside, in which the machine runs when it is called. ' +
      'Told in every answer about what lies ahead and in none of its figures.',
    0.97,
    'not told',
  ).optional(),
};

export type OperationBlock = z.output<typeof operation>;
export type ConnectionBlock = z.output<typeof connection>;
export type OutageBlock = z.output<typeof outage>;
