import { useEffect, useRef, useState } from 'preact/hooks';
import { clock, hoursText } from '../../lib/format.js';
import { ownName } from '../../lib/login.js';
import { typedPower as typedNumber } from '../../lib/powers.js';
import type { Standing } from '../../lib/wire.js';
import { type HidingAction, send } from './commands.js';
import { who } from './who.js';

const SPANS_H = [0.25, 1, 4] as const;
const FIRST_H = '1';

const spanText = (span_h: number) => (Number.isInteger(span_h) ? `${span_h} h` : hoursText(span_h));

const HEADS: Readonly<Record<HidingAction, string>> = {
  shelve: 'Shelve',
  out_of_service: 'Take out of service',
};
const WHAT_IT_DOES: Readonly<Record<HidingAction, string>> = {
  shelve:
    'It is not shown until the time is over; then it is shown again, not acknowledged, if its condition still stands.',
  out_of_service:
    'It is not shown until somebody takes it back into service: there is no time to it.',
};

/**
 * Asks what a person has to say who hides an alarm: who, why, and of a shelf for how long.
 *
 * @param most_h longest time on the shelf [h]
 */
export function HideDialog({
  event,
  action,
  unitName,
  most_h,
  onClose,
}: {
  event: Standing;
  action: HidingAction;
  unitName: string;
  most_h: number;
  onClose(): void;
}) {
  const dialog = useRef<HTMLDialogElement>(null);
  const [hours, setHours] = useState(FIRST_H);
  const [fault, setFault] = useState('');
  const [sending, setSending] = useState(false);
  useEffect(() => dialog.current?.showModal(), []);

  const hours_h = typedNumber(hours);
  const fits = hours_h !== null && hours_h <= most_h;
  async function submit(submitted: Event): Promise<void> {
    submitted.preventDefault();
    // What stands in the fields now: what was typed last may not be drawn yet.
    const said = new FormData(submitted.currentTarget as HTMLFormElement);
    const why = String(said.get('why')).trim();
    const typed = String(said.get('hours') ?? '');
    const time_h = typedNumber(typed);
    if (who.value.trim() === '' && ownName() === null)
      return wrong('Say who: a name is recorded with it.', 'hide-who');
    if (why === '') return wrong('Say why: the reason is recorded with it.', 'hide-why');
    if (action === 'shelve' && (time_h === null || time_h > most_h)) {
      const words = `A time on the shelf is a number of hours, ${most_h} at most; "${typed}" is not.`;
      return wrong(words, 'hide-hours');
    }
    setSending(true);
    const time = action === 'shelve' ? { hours: time_h ?? 0 } : {};
    const told = await send(action, { id: event.id, why, ...time });
    setSending(false);
    if (told === null) dialog.current?.close();
    else setFault(told);
  }
  function wrong(words: string, fieldId: string): void {
    setFault(words);
    document.getElementById(fieldId)?.focus();
  }

  return (
    <dialog ref={dialog} class="hide" aria-labelledby="hide-head" onClose={onClose}>
      <form onSubmit={(submitted) => void submit(submitted)} noValidate>
        <h2 id="hide-head">{HEADS[action]}</h2>
        <p>
          <strong>{`${event.kind.replaceAll('_', ' ')} · ${unitName} · ${event.subject}`}</strong>
        </p>
        <p class="when">{WHAT_IT_DOES[action]}</p>
        <label for="hide-who">Who</label>
        <input
          id="hide-who"
          autocomplete="name"
          maxLength={64}
          value={who}
          onInput={(typed) => {
            who.value = typed.currentTarget.value;
          }}
        />
        <label for="hide-why">Why</label>
        <input id="hide-why" name="why" maxLength={200} />
        {action === 'shelve' && (
          <>
            <label for="hide-hours">{`For how many hours, ${most_h} at most`}</label>
            <p class="entry">
              <input
                id="hide-hours"
                name="hours"
                inputMode="decimal"
                size={5}
                value={hours}
                aria-describedby="hide-until"
                onInput={(typed) => setHours(typed.currentTarget.value)}
              />
              {[...SPANS_H.filter((span) => span < most_h), most_h].map((span) => (
                <button
                  key={span}
                  type="button"
                  aria-pressed={hours_h === span}
                  onClick={() => setHours(String(span))}
                >
                  {spanText(span)}
                </button>
              ))}
            </p>
            <p id="hide-until" class="when" aria-live="polite">
              {fits && `until about ${clock(Date.now() + hours_h * 3_600_000)} by this clock`}
            </p>
          </>
        )}
        <p class="fault" role="alert">
          {fault}
        </p>
        <p class="buttons">
          <button type="submit" disabled={sending}>
            {HEADS[action]}
          </button>
          <button type="button" onClick={() => dialog.current?.close()}>
            Leave it shown
          </button>
        </p>
      </form>
    </dialog>
  );
}
