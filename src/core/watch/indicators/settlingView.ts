import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import type { IndicatorReason, IndicatorRule, IndicatorView } from '../indicator.js';
import { fromTop, type Level, type Top } from './settlingLevel.js';
import { type Followed, shownAs } from './shown.js';

/** Gas and rock must have moved apart by this, or a reading tells nothing of which it follows [K]. */
export const APART_K = 5;
/** Where the bed has sunk as a whole, a thermocouple that last showed more of the gas than this hangs in it. */
const HANGS = 0.6;
/** A topmost thermocouple deeper than this tells of the bed's level late, if at all [m]. */
const DEEP_M = 0.3;

interface Found {
  /** Deepest uncovered thermocouple and the next one below it [m]; null: none is uncovered. */
  readonly least_m: number | null;
  readonly most_m: number;
  readonly ids: string[];
  /** Topmost thermocouple of the store [m]. */
  readonly top_m: number;
  /** The test that is furthest on. */
  readonly followed: Followed;
}

function found(level: Level, model: StoreModel, state: StoreState): Found {
  let least: number | null = null;
  let most = model.store.bed.length_m;
  let topmost = model.store.bed.length_m;
  const ids: string[] = [];
  const { whole } = level;
  let followed = whole;
  const further = (a: Followed, b: Followed) =>
    Number(a.test.degraded) - Number(b.test.degraded) || a.test.up - b.test.up;
  const hangs = ({ first, followed: own }: Top): boolean =>
    own.test.degraded || (first && whole.test.degraded && (own.value ?? 0) > HANGS);
  model.tubes.forEach(({ string }, k) => {
    const places = fromTop(model, k);
    let deepest = -1;
    places.forEach(({ sensor, depth_m }, i) => {
      topmost = Math.min(topmost, depth_m);
      const top = level.tops.find((t) => t.tube === k && t.sensor === sensor);
      const judged = state.sensors[k]?.[sensor]?.verdict === 'uncovered';
      if (top !== undefined && further(top.followed, followed) > 0) followed = top.followed;
      if (!judged && (top === undefined || !hangs(top))) return;
      deepest = i;
      ids.push(string.thermocouples[sensor]?.id ?? '');
    });
    if (deepest < 0) return;
    const { depth_m } = places[deepest] as { depth_m: number };
    if (least !== null && depth_m <= least) return;
    least = depth_m;
    most = places[deepest + 1]?.depth_m ?? model.store.bed.length_m;
  });
  return { least_m: least, most_m: most, ids, top_m: topmost, followed };
}

/** What is known of the bed's level. */
export function settlingView(
  level: Level,
  model: StoreModel,
  state: StoreState,
  gas: number,
  rule: IndicatorRule,
): IndicatorView {
  const now = found(level, model, state);
  const sunk = now.least_m;
  let reason: IndicatorReason | null = null;
  if (gas < 0 || now.top_m > DEEP_M) reason = 'not_instrumented';
  const shown = shownAs({
    kind: 'settling',
    subject: model.store.id,
    unit: 'm',
    rule,
    followed: now.followed,
    healthy: 0,
    healthy_from: 'law',
    reason,
    // Less than down to the topmost thermocouple is not seen.
    limit: Math.max(rule.limit, now.top_m),
    sentence: sentence(model.store.id, now, gas, rule),
  });
  const tested = now.followed.test.count > 0;
  return {
    ...shown,
    state: sunk !== null ? 'degraded' : shown.state,
    reason: sunk !== null ? null : shown.reason,
    score: sunk !== null ? 1 : shown.score,
    value: sunk ?? (tested ? 0 : null),
    sigma:
      sunk === null
        ? tested
          ? now.top_m / Math.sqrt(12)
          : null
        : (now.most_m - sunk) / Math.sqrt(12),
  };
}

function sentence(store: string, now: Found, gas: number, rule: IndicatorRule): string {
  const { least_m, most_m, ids, top_m, followed } = now;
  if (least_m !== null)
    return (
      `Store ${store}: ${ids.join(', ')} hang${ids.length > 1 ? '' : 's'} in gas, no longer in rock: the bed has ` +
      `sunk by ${least_m.toFixed(2)} to ${most_m.toFixed(2)} m there.`
    );
  const deep =
    top_m > rule.limit
      ? ` Its topmost thermocouple hangs ${top_m.toFixed(2)} m below the top of the bed: less is not seen.`
      : '';
  if (gas < 0)
    return `Store ${store}: the gas above the bed is not measured, so a sunken bed shows late or not at all.`;
  if (top_m > DEEP_M)
    return `Store ${store}: no thermocouple is close to the top of the bed.${deep}`;
  if (followed.test.count === 0)
    return `Store ${store}: gas above the bed and rock have not moved apart by ${APART_K} K while standing, so where the topmost thermocouples hang is not known.${deep}`;
  return `Store ${store}: its topmost thermocouples are in rock.${deep}`;
}
