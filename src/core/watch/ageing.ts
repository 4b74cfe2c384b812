import type { Mode } from '../definitions.js';
import type { IndicatorKind, IndicatorReason, IndicatorView } from './indicator.js';

/** What shows an indicator, and how much of it may pass without a value before `normal` is stale. */
interface Stale {
  readonly while: 'flow' | 'stand' | 'any';
  /** A stretch of it tells nothing until then [h]. */
  readonly after_h: number;
  /** Ten of its values at their usual spacing [h]. */
  readonly most_h: number;
}

const stale = (what: Stale['while'], after_h: number, most_h: number): Stale => ({
  while: what,
  after_h,
  most_h,
});

/**
 * Hours of flow with a front in the bed, a third of all flow at the least, make the values of the filter;
 * runs of half a day those of their ends; hours of one mode those of the instruments.
 */
const STALE: Readonly<Record<IndicatorKind, Stale>> = {
  spread_ratio: stale('flow', 1, 40),
  heat_transfer: stale('flow', 1, 40),
  string_flow: stale('flow', 1, 40),
  front_travel: stale('flow', 1, 80),
  standing_loss: stale('stand', 7, 40),
  valve_leak: stale('stand', 3, 20),
  pressure_drop: stale('flow', 1, 10),
  plateau: stale('flow', 1, 20),
  gas_inventory: stale('any', 0, 24),
  settling: stale('any', 0, 240),
  store_mismatch: stale('flow', 1, 80),
  front_view: stale('flow', 1, 80),
  energy_lost: stale('flow', 1, 80),
  sensor_health: stale('any', 0, 24),
};

/** Whatever the plant did: what is older than this is not known any more [days]. */
const OLD_D = 30;
/** A time without scans counts as no more than this [s]: nobody knows what the plant did. */
const GAP_S = 3600;

/** Since when each indicator's newest value stands. Plain and bounded by the number of views. */
export interface Ageing {
  mode: Mode | null;
  /** Time of the present mode [s]. */
  stretch_s: number;
  readonly since: Record<string, Newest>;
}

interface Newest {
  /** Its time, as shown, and in [ms]. */
  time: string;
  time_ms: number;
  /** For so long the plant has done since what would have shown more [s]. */
  spent_s: number;
}

export function startAgeing(): Ageing {
  return { mode: null, stretch_s: 0, since: {} };
}

/**
 * `normal` must rest on something: it becomes `undetermined` where
 *
 * - its sigma is as large as its limit is off from healthy: `too_uncertain`;
 * - ten values' worth of what would show it has passed without one (STALE): a channel is dead, or readings
 *   no longer tell it: `too_uncertain`;
 * - its newest value is older than 30 days: `not_exercised`.
 *
 * What is degraded stays so: no value has spoken against it.
 *
 * @param ageing changed in place
 */
export function ageViews(
  ageing: Ageing,
  views: readonly IndicatorView[],
  scan: { readonly mode: Mode; readonly time_ms: number; readonly dt_s: number },
): IndicatorView[] {
  const { mode, time_ms } = scan;
  const passed_s = Math.min(scan.dt_s, GAP_S);
  ageing.stretch_s = mode === ageing.mode ? ageing.stretch_s + passed_s : 0;
  ageing.mode = mode;
  const aged = views.map((view) => {
    if (view.time === null) return view;
    const key = `${view.kind}/${view.subject}`;
    let newest = ageing.since[key];
    if (newest === undefined || newest.time !== view.time) {
      newest = { time: view.time, time_ms: Date.parse(view.time), spent_s: 0 };
      ageing.since[key] = newest;
    } else if (tells(STALE[view.kind], ageing)) newest.spent_s += passed_s;
    return view.state === 'normal' ? doubted(view, newest, time_ms) : view;
  });
  forget(ageing, views);
  return aged;
}

function tells({ while: what, after_h }: Stale, { mode, stretch_s }: Ageing): boolean {
  if (stretch_s < 3600 * after_h) return false;
  return what === 'any' || (what === 'stand') === (mode === 'stand');
}

const made = new WeakMap<IndicatorView, Partial<Record<string, IndicatorView>>>();

function doubted(view: IndicatorView, newest: Newest, time_ms: number): IndicatorView {
  const { kind, sigma, healthy, limit } = view;
  const { while: what, most_h } = STALE[kind];
  if (sigma !== null && sigma > 0 && healthy !== null && sigma >= Math.abs(limit - healthy))
    return open(view, 'too_uncertain', 'Its sigma is as large as the limit is off: not decided.');
  const words = { flow: 'flow', stand: 'standing', any: 'readings' }[what];
  const at = view.time?.slice(0, 16).replace('T', ' ');
  if (newest.spent_s > 3600 * most_h)
    return open(
      view,
      'too_uncertain',
      `That was at ${at} UTC; ${most_h} h of ${words} since then have told nothing more: no longer decided.`,
    );
  if (time_ms - newest.time_ms > 86_400_000 * OLD_D)
    return open(
      view,
      'not_exercised',
      `That was at ${at} UTC, more than ${OLD_D} days ago: no longer decided.`,
    );
  return view;
}

/** The view left open, the same one as long as the view itself is the same. */
function open(view: IndicatorView, reason: IndicatorReason, words: string): IndicatorView {
  const known = made.get(view)?.[words];
  if (known !== undefined) return known;
  const sentence = `${view.sentence} ${words}`;
  const one: IndicatorView = { ...view, state: 'undetermined', reason, sentence };
  made.set(view, { [words]: one });
  return one;
}

/** Subjects that a changed configuration no longer has. */
function forget({ since }: Ageing, views: readonly IndicatorView[]): void {
  if (Object.keys(since).length <= views.length) return;
  const keys = new Set(views.map(({ kind, subject }) => `${kind}/${subject}`));
  for (const key of Object.keys(since)) {
    if (!keys.has(key)) delete since[key];
  }
}
