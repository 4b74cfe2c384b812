import type { CauseView } from './causes.js';
import { CAUSES } from './causeTable.js';
import type { EventKind } from './event.js';
import { type IndicatorKind, type IndicatorView, UNIT_INDICATORS } from './indicator.js';
import { INDICATOR_EVENTS } from './kinds.js';

/** From this probability on a cause explains what follows from it. */
const EXPLAINS = 0.6;
/** An indicator in which a cause shows at least so often tells of it by its own alert. */
const TELLS = 0.5;

/** Kinds that follow from some cause: looked at after the others, whose alerts they may wait for. */
export const MAY_FOLLOW: ReadonlySet<IndicatorKind> = new Set(
  Object.values(CAUSES).flatMap(({ follows = [] }) => follows),
);

/** Whether an indicator may speak of a cause: of the same store, or either of the unit. */
function concerns({ kind, subject }: IndicatorView, { cause, subject: of }: CauseView): boolean {
  return CAUSES[cause].of === 'unit' || UNIT_INDICATORS.has(kind) || subject.split('/')[0] === of;
}

/** Whether a degraded indicator is what tells of a cause, no mere consequence of it. */
function tells(view: IndicatorView, one: CauseView): boolean {
  const { shows, follows = [] } = CAUSES[one.cause];
  const { kind } = view;
  const chance = shows[kind] ?? 0;
  return (
    chance >= TELLS && !follows.includes(kind) && kind in INDICATOR_EVENTS && concerns(view, one)
  );
}

/**
 * Whether an indicator that is degraded only follows from a cause that has an alert already: one
 * trouble is one alert to look after, not three. A second fault is still told: it has alerts that
 * follow from no cause, and what follows is raised once that alert is gone.
 *
 * @param stands whether an indicator is degraded, or its alert stands
 */
export function isConsequence(
  view: IndicatorView,
  views: readonly IndicatorView[],
  causes: readonly CauseView[],
  stands: (other: IndicatorView) => boolean,
): boolean {
  return causes.some(
    (one) =>
      one.probability >= EXPLAINS &&
      (CAUSES[one.cause].follows ?? []).includes(view.kind) &&
      concerns(view, one) &&
      views.some((other) => tells(other, one) && stands(other)),
  );
}

/** Alerts that wait while that of an indicator stands; none where its cause is not sure enough. */
export function waitingFor(view: IndicatorView, causes: readonly CauseView[]): EventKind[] {
  const one = causes.find((c) => c.probability >= EXPLAINS && tells(view, c));
  if (one === undefined) return [];
  return (CAUSES[one.cause].follows ?? []).flatMap((kind) => INDICATOR_EVENTS[kind] ?? []);
}
