import type { AlarmEntry } from './entry.js';
import { type AlarmFigures, type Annunciation, alarmFigures } from './figures.js';
import { isHeldBack } from './state.js';

/** Figures of an alarm system over a span, with times as ISO 8601 UTC and what is held back now. */
export interface AlarmReport extends Omit<AlarmFigures, 'floods'> {
  /** null: all units. */
  readonly unit: string | null;
  readonly from: string;
  readonly to: string;
  readonly floods: readonly {
    readonly from: string;
    readonly to: string | null;
    readonly count: number;
    readonly most_in_10_min: number;
  }[];
  /** Alerts shown in the span; they are no load on the operator and count in none of the figures. */
  readonly alerts: number;
  /** Now, alarms and alerts. */
  readonly held_back: Readonly<
    Record<'shelved' | 'suppressed_by_design' | 'out_of_service', number>
  >;
}

export interface ReportInput {
  readonly unit: string | null;
  readonly from_ms: number;
  readonly to_ms: number;
  /** Of alarms, from ten minutes before the span on; see alarmFigures. */
  readonly annunciations: readonly Annunciation[];
  readonly alerts: number;
  readonly entries: readonly AlarmEntry[];
}

/** @throws RangeError as alarmFigures */
export function alarmReport(input: ReportInput): AlarmReport {
  const { unit, from_ms, to_ms, annunciations, alerts, entries } = input;
  const standing = entries
    .filter((entry) => entry.class === 'alarm' && entry.active && !isHeldBack(entry.state))
    .map(({ id, time }) => ({ id, since_ms: Date.parse(time) }));
  const { floods, ...figures } = alarmFigures({ from_ms, to_ms, annunciations, standing });
  const held = (state: AlarmEntry['state']) => entries.filter((e) => e.state === state).length;
  const iso = (ms: number) => new Date(ms).toISOString();
  return {
    unit,
    from: iso(from_ms),
    to: iso(to_ms),
    ...figures,
    floods: floods.map(({ from_ms, to_ms, ...rest }) => {
      return { from: iso(from_ms), to: to_ms === null ? null : iso(to_ms), ...rest };
    }),
    alerts,
    held_back: {
      shelved: held('shelved'),
      suppressed_by_design: held('suppressed_by_design'),
      out_of_service: held('out_of_service'),
    },
  };
}
