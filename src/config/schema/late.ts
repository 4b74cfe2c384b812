import { z } from 'zod';
import { key, positive } from './key.js';

/** Readings that come when their scan is closed, as from a gateway that has stored them. */
export const lateSchema = z.strictObject({
  rewind_h: key(
    z.number().min(0).max(720),
    'h',
    'Scans are made again with late readings up to this age against the newest reading; 0 = never.',
    48,
  ).default(48),
  rewind_point_every_s: key(
    z.int().min(60).max(86400),
    's',
    'Spacing of the states that are kept over rewind_h to go back to.',
    900,
  ).default(900),
  quiet_s: key(
    positive(3600),
    's',
    'Late readings are taken in once none has come for this long.',
    30,
  ).default(30),
  wait_most_s: key(
    positive(86400),
    's',
    'While late readings keep coming, they are taken in at the latest after this.',
    600,
  ).default(600),
});

export type LateBlock = z.output<typeof lateSchema>;
