import type { UnitDefinition } from '../../src/core/definitions.js';
import { advance, type UnitState } from '../../src/core/unit.js';
import type { CauseView, WatchView } from '../../src/core/watch/causes.js';
import type { WatchEvent } from '../../src/core/watch/event.js';
import type { IndicatorView } from '../../src/core/watch/indicator.js';
import type { Recording } from '../score/recording.js';

/** Something that was raised or returned, and what was held for its cause in that scan. */
export interface Told extends Pick<WatchEvent, 'kind' | 'class' | 'subject' | 'transition'> {
  /** Since the start of the stretch [h]. */
  readonly t_h: number;
  readonly value: number | null;
  readonly message: string;
}

/** The most probable cause from a time on; null: nothing is held to be degraded. */
export interface Believed {
  readonly t_h: number;
  readonly cause: Pick<CauseView, 'cause' | 'subject' | 'probability'> | null;
}

/** What the watch made of one stretch. */
export interface WatchRun {
  readonly hours: number;
  readonly events: readonly Told[];
  readonly causes: readonly Believed[];
  /** Indicators as they stood at the end. */
  readonly views: readonly IndicatorView[];
  /** Computing time of the estimator [s]. */
  readonly cpu_s: number;
}

/** Called after each scan, with hours since the start of the stretch. */
export type Look = (t_h: number, watch: WatchView, events: readonly WatchEvent[]) => void;

const NOTHING = { hours_at_W: [], profile: false };

/**
 * Runs the estimator with its watch over a recording, without any hours asked.
 *
 * @param state changed in place: goes on from where it stands
 */
export function watchRecording(
  unit: UnitDefinition,
  state: UnitState,
  recording: Recording,
  look?: Look,
): WatchRun {
  const { scans, period_s } = recording.header;
  const ids = unit.channels.map((c) => c.id);
  const held = new Uint8Array(ids.length);
  const events: Told[] = [];
  const causes: Believed[] = [];
  let views: readonly IndicatorView[] = [];
  let top = '';
  const before = process.cpuUsage();
  for (let n = 0; n < scans; n++) {
    const values = Float64Array.from(ids, (id) => recording.reading(id, n));
    const scan = { time_ms: recording.time_ms(n), values, held };
    const step = advance(unit, state, scan, NOTHING);
    const t_h = ((n + 1) * period_s) / 3600;
    for (const event of step.events) {
      const { kind, subject, transition, value, message } = event;
      events.push({ t_h, kind, class: event.class, subject, transition, value, message });
    }
    const first = step.watch?.causes[0];
    const name = first === undefined ? '' : `${first.cause}/${first.subject}`;
    if (name !== top) {
      top = name;
      causes.push({ t_h, cause: first === undefined ? null : pick(first) });
    }
    if (step.watch !== undefined) {
      views = step.watch.indicators;
      look?.(t_h, step.watch, step.events);
    }
  }
  const { user, system } = process.cpuUsage(before);
  const hours = (scans * period_s) / 3600;
  return { hours, events, causes, views, cpu_s: (user + system) / 1e6 };
}

const pick = ({ cause, subject, probability }: CauseView) => ({ cause, subject, probability });
