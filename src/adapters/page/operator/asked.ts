import type { UnitEntry } from '../lib/model.js';
import { api } from '../lib/page.js';
import { isSamePower } from '../lib/powers.js';
import { type Answer, useAnswer } from '../lib/useAnswer.js';
import type { AskedHeadroom, AskedHours, DispatchAnswer, LimitedAnswer } from '../lib/wire.js';
import { useHeld } from '../parts/useHeld.js';
import { useSettled } from '../parts/useSettled.js';

/** At most so often is the same kind of question asked: a recording at full speed moves fast [ms]. */
const HOURS_EVERY_MS = 2_000;
const HEADROOM_EVERY_MS = 10_000;

/** The answer at rated power, or the one nearest to it. */
export function nearestToRated(entry: UnitEntry | null): DispatchAnswer | null {
  const rated = entry?.definition?.rated_power_MW_el;
  const answers = entry?.state?.dispatch?.answers ?? [];
  if (rated === undefined) return answers[0] ?? null;
  const away = (answer: DispatchAnswer) => Math.abs(answer.power_MW - rated);
  return answers.reduce<DispatchAnswer | null>(
    (best, answer) => (best === null || away(answer) < away(best) ? answer : best),
    null,
  );
}

/** What answers about the time ahead rest on: asked again when it changes. */
function basisOf(entry: UnitEntry | null): string {
  return `${entry?.state?.dispatch?.time} ${entry?.state?.estimate?.mode}`;
}

/** Power that is delivered now, to a hundredth [MW]; null while none is. */
export function deliveredPower(entry: UnitEntry | null): number | null {
  const power = entry?.state?.power_MW_el ?? null;
  if (power === null || entry?.state?.estimate?.mode !== 'discharge') return null;
  const delivered = Math.round(-power * 100) / 100;
  return delivered > 0 ? delivered : null;
}

/** The answer at a configured power where that is what is delivered now; null where none is. */
export function configuredNow(entry: UnitEntry | null): LimitedAnswer | null {
  const power_MW = deliveredPower(entry);
  if (power_MW === null) return null;
  const answers = entry?.state?.dispatch?.answers ?? [];
  return answers.find((one) => isSamePower(power_MW, one.power_MW)) ?? null;
}

/** An answer about another unit is no answer. */
function ofUnit<T extends { unit: string }>(answer: T | null, entry: UnitEntry | null): T | null {
  return answer !== null && answer.unit === entry?.unit ? answer : null;
}

/** Hours at one power, asked again when what they rest on moves; null asks nothing. */
export function useHours(entry: UnitEntry | null, power_MW: number | null): Answer<AskedHours> {
  const basis = useSettled(basisOf(entry), HOURS_EVERY_MS);
  const key = useHeld(
    entry === null || power_MW === null ? null : `${entry.unit} ${power_MW} ${basis}`,
  );
  const asked = useAnswer(key, (signal) => api.hours(entry?.unit ?? '', power_MW ?? 0, signal));
  return { ...asked, answer: ofUnit(asked.answer, entry) };
}

/** Hours at the power that is delivered now; null where that is a configured one. */
export function usePresentHours(entry: UnitEntry | null): AskedHours | null {
  const asked_MW = configuredNow(entry) === null ? deliveredPower(entry) : null;
  const power_MW = useSettled(asked_MW, HOURS_EVERY_MS);
  return useHours(entry, power_MW).answer;
}

/** What the unit can still take at its rated power, or at the most that it charges with. */
export function useHeadroom(entry: UnitEntry | null): Answer<AskedHeadroom> {
  const definition = entry?.definition ?? null;
  const most = definition?.limits.charge.power_max_MW_el ?? 0;
  const power_MW = Math.min(definition?.rated_power_MW_el ?? 0, most);
  const basis = useSettled(basisOf(entry), HEADROOM_EVERY_MS);
  const worth = entry?.state?.dispatch != null && power_MW > 0;
  const key = useHeld(worth ? `${entry?.unit} ${power_MW} ${basis}` : null);
  const asked = useAnswer(key, (signal) => {
    const path = api.path(entry?.unit ?? '', 'headroom');
    return api.get<AskedHeadroom>(path, { power_MW, stale: 'mark' }, signal);
  });
  return { ...asked, answer: ofUnit(asked.answer, entry) };
}
