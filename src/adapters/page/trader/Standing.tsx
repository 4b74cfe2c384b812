import { ageText, QUALITY_WORDS } from '../lib/format.js';
import { model } from '../lib/page.js';
import type { Asked } from './asking.js';
import { ageOfAnswer, movedOn, sourceNow } from './moved.js';
import { clockIn, zoneWords } from './times.js';
import type { AnswerHead } from './wire.js';

/** What an answer stands on, how old that is, and whether the unit has moved on since. */
export function StandsOn({ asked, onAsk }: { asked: Asked<AnswerHead>; onAsk(): void }) {
  const { answer, was } = asked;
  const entry = model.unit.value;
  if (answer === null || entry === null) return null;
  const now_ms = sourceNow(entry, model.tick_ms.value);
  const zone = answer.limits.connection?.time_zone ?? null;
  const moved = movedOn(answer, was, entry, now_ms);
  return (
    <div class="stands-on" data-moved={moved === null ? undefined : ''}>
      <p>
        From the estimate of {clockIn(zone, answer.time)},{' '}
        <span data-field="answer-age">{ageText(ageOfAnswer(answer, now_ms))}</span> old
        {answer.quality === 'good' ? '' : ` (${QUALITY_WORDS[answer.quality]})`}. Times are those of{' '}
        {zoneWords(zone)}.
      </p>
      {moved !== null && (
        <p class="moved" role="status">
          <span aria-hidden="true">▲ </span>
          {moved}{' '}
          <button type="button" onClick={onAsk} disabled={asked.since_ms !== null}>
            Ask again
          </button>
        </p>
      )}
    </div>
  );
}

/** That an answer is awaited, for how long, and how to give it up; or what was wrong. */
export function Awaited({
  asked,
  usual,
  onCancel,
}: {
  asked: Asked<unknown>;
  /** What it usually takes, in words. */
  usual: string;
  onCancel(): void;
}) {
  const { since_ms, fault } = asked;
  const seconds =
    since_ms === null
      ? 0
      : Math.max(
          0,
          Math.floor((Math.max(model.tick_ms.value, performance.now()) - since_ms) / 1000),
        );
  return (
    <>
      <div class="awaited" hidden={since_ms === null}>
        <p role="status">{since_ms === null ? '' : `Being worked out; this takes ${usual}.`}</p>
        <p>
          <span data-field="waited">{seconds} s</span>{' '}
          <button type="button" onClick={onCancel}>
            Cancel
          </button>
        </p>
      </div>
      <p class="fault" role="alert">
        {fault ?? ''}
      </p>
    </>
  );
}
