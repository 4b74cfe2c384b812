import { END_WORDS, fixed, hoursText, LIMIT_WORDS, power } from '../lib/format.js';
import type { LimitedAnswer } from '../lib/wire.js';
import { Unit } from '../parts/Unit.js';

const LEVELS = [
  { key: 'p90', label: 'firm, p90' },
  { key: 'p50', label: 'p50' },
  { key: 'p10', label: 'p10' },
] as const;

/** Bar of one answer: sure up to p90, open up to p10, a mark at p50. */
function HoursBar({ hours, full_h }: { hours: LimitedAnswer['hours']; full_h: number }) {
  const share = (value: number) => Math.max(0, Math.min(100, (100 * value) / full_h));
  const [p90, p50, p10] = [share(hours.p90), share(hours.p50), share(hours.p10)];
  return (
    <svg class="bar" viewBox="0 0 100 14" preserveAspectRatio="none" aria-hidden="true">
      <rect class="rail" x="0" y="6.5" width="100" height="1" />
      <rect class="sure" x="0" y="3" width={p90} height="8" />
      <rect class="maybe" x={p90} y="5" width={Math.max(0.4, p10 - p90)} height="4" />
      <rect class="middle" x={p50 - 0.4} y="0" width="0.8" height="14" />
    </svg>
  );
}

/** What keeps the unit from the power, or ends it, and what is missing at first. */
function endWords({ ends_by, limited_by }: LimitedAnswer): string {
  const limit = limited_by === null ? '' : `limited: ${LIMIT_WORDS[limited_by]} · `;
  return `${limit}ends: ${END_WORDS[ends_by]}`;
}

function firstWords({ first_minutes }: LimitedAnswer): string | null {
  if (first_minutes === undefined) return null;
  const { lacking_at_worst_MW, minutes, probability } = first_minutes;
  const share = Math.round(probability * 100);
  return (
    `In the first minutes up to ${fixed(lacking_at_worst_MW, 2)} MW electric may be missing` +
    `${minutes > 0 ? `, likely for ${fixed(minutes, 0)} min` : ''} (${share} % likely): ` +
    'gas that stood is pushed out first.'
  );
}

/** One power: the firm hours large, the likely and the hopeful ones beside, with the energy. */
export function HoursRow({
  answer,
  full_h,
  note,
}: {
  answer: LimitedAnswer;
  full_h: number;
  note?: string | undefined;
}) {
  const first = firstWords(answer);
  return (
    <li data-power={answer.power_MW}>
      <p class="head">
        <span>
          at <strong>{power(answer.power_MW)}</strong>
          <Unit name="MW_el" />
          {note !== undefined && <span class="p">{`, ${note}`}</span>}
        </span>
        <span class="ends">{endWords(answer)}</span>
      </p>
      <HoursBar hours={answer.hours} full_h={full_h} />
      <dl>
        {LEVELS.map(({ key, label }) => (
          <div key={key} class={key}>
            <dt class="p">{label}</dt>
            <dd class="time" data-field={key}>
              {hoursText(answer.hours[key])}
            </dd>
            <dd class="energy">
              <span data-field={`energy-${key}`}>{fixed(answer.energy_MWh_el[key], 2)}</span>
              <Unit name="MWh_el" />
            </dd>
          </div>
        ))}
      </dl>
      {first !== null && <p class="first">{first}</p>}
    </li>
  );
}
