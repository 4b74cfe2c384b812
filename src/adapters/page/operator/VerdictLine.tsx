import { isOpen, openWords } from '../lib/alarmOrder.js';
import { model } from '../lib/page.js';
import { trustOf } from '../lib/trust.js';
import { verdictOf } from '../lib/verdict.js';
import { VerdictSign } from '../parts/VerdictSign.js';

/** The first thing that is seen: is all well with this unit, and is it elsewhere. */
export function VerdictLine() {
  const entry = model.unit.value;
  const trust = trustOf(model.connection.value, entry);
  const [own, others] = [true, false].map((mine) =>
    model.standing.value.filter((event) => (event.unit === entry?.unit) === mine),
  );
  const { level, words, because } = verdictOf(trust, entry, own ?? []);
  const elsewhere = openWords((others ?? []).filter(isOpen)).words;
  return (
    <div id="verdict" role="status" data-level={level}>
      <VerdictSign level={level} />
      <p>
        <strong data-field="verdict">{words}</strong>
        <span class="because">
          {because}
          {elsewhere !== '' && ` · elsewhere ${elsewhere} to acknowledge`}
        </span>
      </p>
    </div>
  );
}
