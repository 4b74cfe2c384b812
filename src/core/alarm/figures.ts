import { countFloods, type Flood, WINDOW_MS } from './flood.js';

/** An alarm shown to the operator as unacknowledged: raised, raised again or let go. */
export interface Annunciation {
  readonly id: string;
  readonly time_ms: number;
  readonly priority: 'high' | 'medium' | 'low';
}

export interface FiguresInput {
  readonly from_ms: number;
  readonly to_ms: number;
  /** Alarms within the span and the ten minutes before it, in order of time. */
  readonly annunciations: readonly Annunciation[];
  /** Alarms that stand at the end of the span, shown, since when. */
  readonly standing: readonly { readonly id: string; readonly since_ms: number }[];
}

export interface AlarmFigures {
  readonly annunciated: number;
  /** Share of each priority; null without any alarm. */
  readonly by_priority: Readonly<Record<'high' | 'medium' | 'low', number>> | null;
  readonly per_10_min: number;
  readonly per_day: number;
  /** Most in any ten minutes. */
  readonly most_in_10_min: number;
  readonly floods: readonly Flood[];
  /** Share of the span in a flood. */
  readonly share_in_flood: number;
  readonly chattering: readonly { readonly id: string; readonly most_in_a_minute: number }[];
  /** Stand longer than a day. */
  readonly stale: readonly { readonly id: string; readonly hours: number }[];
  /** The ten most frequent ones. */
  readonly most_frequent: readonly {
    readonly id: string;
    readonly count: number;
    readonly share: number;
  }[];
  readonly share_of_most_frequent: number | null;
}

const MINUTE_MS = 60_000;
const DAY_MS = 86_400_000;
/** The same alarm so often within a minute chatters. */
const CHATTER_COUNT = 3;
const MOST_FREQUENT = 10;

/**
 * Figures by which ISA-18.2 and IEC 62682 judge an alarm system over a span (their clause on
 * monitoring and assessment): rates, floods, chattering, stale and most frequent alarms.
 *
 * @throws RangeError for a span that is empty or not finite, or annunciations out of order
 */
export function alarmFigures(input: FiguresInput): AlarmFigures {
  const { from_ms, to_ms, annunciations } = input;
  if (!(to_ms > from_ms && Number.isFinite(to_ms - from_ms)))
    throw new RangeError(`the span must end after it begins, got ${from_ms} to ${to_ms}`);
  const within = annunciations.filter(({ time_ms }) => time_ms >= from_ms && time_ms <= to_ms);
  const times = annunciations.map(({ time_ms }) => time_ms);
  const { floods, in_flood_ms, most } = countFloods(times, from_ms, to_ms);
  const count = within.length;
  const span_ms = to_ms - from_ms;
  const frequent = countBy(within)
    .slice(0, MOST_FREQUENT)
    .map(([id, times]) => ({ id, count: times, share: times / count }));
  return {
    annunciated: count,
    by_priority: count === 0 ? null : shares(within),
    per_10_min: (count * WINDOW_MS) / span_ms,
    per_day: (count * DAY_MS) / span_ms,
    most_in_10_min: most,
    floods,
    share_in_flood: in_flood_ms / span_ms,
    chattering: chattering(within),
    stale: input.standing
      .map(({ id, since_ms }) => ({ id, hours: (to_ms - since_ms) / 3_600_000 }))
      .filter(({ hours }) => hours > 24)
      .sort((a, b) => b.hours - a.hours),
    most_frequent: frequent,
    share_of_most_frequent:
      count === 0 ? null : frequent.reduce((sum, { count: one }) => sum + one, 0) / count,
  };
}

/** Ids by how often they came, the most frequent first. */
function countBy(annunciations: readonly Annunciation[]): [string, number][] {
  const counts = new Map<string, number>();
  for (const { id } of annunciations) counts.set(id, (counts.get(id) ?? 0) + 1);
  return [...counts].sort((a, b) => b[1] - a[1] || a[0].localeCompare(b[0]));
}

function shares(annunciations: readonly Annunciation[]): Record<Annunciation['priority'], number> {
  const share = (priority: Annunciation['priority']) =>
    annunciations.filter((one) => one.priority === priority).length / annunciations.length;
  return { high: share('high'), medium: share('medium'), low: share('low') };
}

function chattering(annunciations: readonly Annunciation[]): AlarmFigures['chattering'] {
  const times = new Map<string, number[]>();
  for (const { id, time_ms } of annunciations) {
    const list = times.get(id);
    if (list) list.push(time_ms);
    else times.set(id, [time_ms]);
  }
  return [...times]
    .map(([id, list]) => ({ id, most_in_a_minute: mostWithin(list, MINUTE_MS) }))
    .filter(({ most_in_a_minute }) => most_in_a_minute >= CHATTER_COUNT)
    .sort((a, b) => b.most_in_a_minute - a.most_in_a_minute || a.id.localeCompare(b.id));
}

/** Most of ascending times within any stretch of this length, its end included. */
function mostWithin(times: readonly number[], length_ms: number): number {
  let most = 0;
  let first = 0;
  times.forEach((time, i) => {
    while (time - (times[first] as number) > length_ms) first++;
    most = Math.max(most, i - first + 1);
  });
  return most;
}
