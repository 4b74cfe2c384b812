import { useRef, useState } from 'preact/hooks';
import { ageText, clock, DASH } from '../lib/format.js';
import { ageNow, type UnitEntry } from '../lib/model.js';
import { model } from '../lib/page.js';
import { roundHours, typedPower } from '../lib/powers.js';
import type { AskedHours, LimitedAnswer } from '../lib/wire.js';
import { Unit } from '../parts/Unit.js';
import { configuredNow, useHours } from './asked.js';
import { HoursRow } from './HoursRow.js';

const STALE = 'Stale: the unit has moved on since the estimate that this stands on.';

/** Hours at the present power, at the configured ones and at one that the user types. */
export function Hours({ entry, present }: { entry: UnitEntry | null; present: AskedHours | null }) {
  const input = useRef<HTMLInputElement>(null);
  const [power_MW, setPower] = useState<number | null>(null);
  const [wrong, setWrong] = useState<string | null>(null);
  const asked = useHours(entry, power_MW);
  const told = power_MW === null || asked.fault !== null ? null : asked.answer;

  const dispatch = entry?.state?.dispatch ?? null;
  const answers = dispatch?.answers ?? [];
  const same = configuredNow(entry);
  const now = same === null ? (present?.answers ?? []) : [];
  const chosen = told?.answers ?? [];
  const longest = [...answers, ...now, ...chosen].map((one) => one.hours.p10);
  const full_h = roundHours(Math.max(0.5, ...longest));
  const row = (answer: LimitedAnswer, note?: string) => (
    <HoursRow key={answer.power_MW} answer={answer} full_h={full_h} note={note} />
  );

  function submit(event: Event): void {
    event.preventDefault();
    const typed = input.current?.value ?? '';
    const value = typedPower(typed);
    setPower(value);
    setWrong(
      value === null
        ? `A power in MW is a number above 0 and below 10000, as in 1.8; "${typed}" is not.`
        : null,
    );
  }

  return (
    <section id="hours" aria-labelledby="hours-head" tabIndex={-1}>
      <h2 id="hours-head">Hours left</h2>
      {now.length > 0 && <ol class="hours asked-now">{now.map((one) => row(one, 'as now'))}</ol>}
      {present?.stale && <p class="fault">{STALE}</p>}
      <ol class="hours configured">
        {answers.map((one) => row(one, one === same ? 'as now' : undefined))}
      </ol>
      <HoursAge entry={entry} full_h={full_h} />
      <form class="ask" onSubmit={submit}>
        <label for="power">Hours at</label>
        <span class="entry">
          <input
            ref={input}
            id="power"
            inputMode="decimal"
            autocomplete="off"
            size={6}
            aria-describedby="power-fault"
            aria-invalid={wrong === null ? undefined : 'true'}
          />
          <Unit name="MW_el" />
          <button type="submit">Work out</button>
        </span>
      </form>
      <p id="power-fault" class="fault" role="status">
        {wrong ?? asked.fault}
      </p>
      <p class="fault" data-field="asked-stale">
        {told?.stale ? STALE : ''}
      </p>
      <ol class="hours asked" aria-live="polite">
        {chosen.map((one) => row(one))}
      </ol>
    </section>
  );
}

/** From which estimate the hours were worked out, and how old that is now. */
function HoursAge({ entry, full_h }: { entry: UnitEntry | null; full_h: number }) {
  const dispatch = entry?.state?.dispatch ?? null;
  const told = entry?.state?.age_s ?? null;
  const now = entry === null ? null : ageNow(entry, model.tick_ms.value);
  const since = told === null || now === null ? 0 : Math.max(0, now - told);
  const age = dispatch === null || dispatch.age_s === null ? null : dispatch.age_s + since;
  return (
    <p class="when" data-field="hours-age">
      {dispatch === null
        ? `${DASH} not worked out yet`
        : `from the estimate of ${clock(dispatch.time)}, ${ageText(age)} old · bars to ${full_h} h`}
    </p>
  );
}
