import { z } from 'zod';
import { isKind } from '../../core/alarm/ids.js';
import { EVENT_KINDS } from '../../core/watch/event.js';
import { key, positive, worded } from './key.js';

/** `KIND`, `KIND/SUBJECT` or `UNIT/KIND/SUBJECT`. */
function namesAlarm(text: string): boolean {
  const parts = text.split('/');
  return parts.every((part) => part !== '') && (isKind(parts[0]) || isKind(parts[1]));
}

/** What may be done to alarms and alerts. */
export const alarmsSchema = z.strictObject({
  shelve_most_h: key(
    positive(168),
    'h',
    'Longest time for which an alarm or alert may be shelved; then it is shown again.',
    8,
  ).default(8),
  out_of_service: key(
    z
      .array(
        worded(
          z.string().max(300).refine(namesAlarm),
          `a kind, KIND/SUBJECT or UNIT/KIND/SUBJECT, with one of the kinds ${EVENT_KINDS.join(', ')}`,
        ),
      )
      .max(500),
    '-',
    'Alarms and alerts that are out of service: kinds, KIND/SUBJECT or UNIT/KIND/SUBJECT.',
    ['database_unreachable', 'sensor_rejected/hot_a_3'],
    'all are in service',
  ).default([]),
  latching: key(
    z.array(z.enum(EVENT_KINDS)).max(EVENT_KINDS.length),
    '-',
    'Kinds that stay in the list after their return until somebody has looked and resets them.',
    ['bed_settled'],
    'no kind latches',
  ).default([]),
});

export type AlarmsBlock = z.output<typeof alarmsSchema>;
