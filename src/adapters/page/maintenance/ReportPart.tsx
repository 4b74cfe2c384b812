import { useRef, useState } from 'preact/hooks';
import { dateClock } from '../lib/format.js';
import { api, model } from '../lib/page.js';
import { localField } from './moments.js';

const DAY_MS = 86_400_000;
const DAYS = 30;
const TABLES = {
  findings: 'findings',
  runs: 'runs',
  indicators: 'indicators',
  thermocouples: 'thermocouples',
  events: 'alarms and alerts',
} as const;

/** The report for a span of time: findings first, one file that can be kept and sent on. */
export function ReportPart({ unit }: { unit: string }) {
  const [chosen, setSpan] = useState<Span | null>(null);
  // The span ends with the newest estimate of when the part was opened, or of when there was one.
  const opened = useRef<Span | null>(null);
  const time = model.unit.value?.state?.estimate?.time;
  if (opened.current === null && time !== undefined) opened.current = monthBefore(Date.parse(time));
  const span = chosen ?? opened.current ?? monthBefore(Date.now());
  const fault = faultOf(span);
  const query = fault === null ? { from: isoOf(span.from), to: isoOf(span.to) } : {};
  const href = (more: Record<string, string>) =>
    api.href(api.path(unit, 'report'), { ...query, ...more });
  return (
    <>
      <p class="rock-key">
        What happened to the beds in a span of time: findings with their evidence first, then runs,
        indicators, thermocouples and alarms. One file, whole in itself. A month takes a few seconds
        to put together.
      </p>
      <form class="rock-asks" onSubmit={(event) => event.preventDefault()}>
        <Field
          id="report-from"
          words="From"
          value={span.from}
          onInput={(from) => setSpan({ ...span, from })}
        />
        <Field
          id="report-to"
          words="To"
          value={span.to}
          onInput={(to) => setSpan({ ...span, to })}
        />
      </form>
      {fault === null && (
        <p class="when" data-field="report-span">
          {`From ${dateClock(span.from)} to ${dateClock(span.to)}`}
        </p>
      )}
      <p class="fault" role="alert">
        {fault}
      </p>
      {fault === null && (
        <>
          <p class="rock-open">
            <a href={href({ format: 'html' })} target="_blank" rel="noopener">
              Open the report
            </a>
            <small> in a new tab</small>
          </p>
          <p>
            To work on: <a href={href({ format: 'json' })}>all of it as JSON</a>; as CSV{' '}
            {Object.entries(TABLES).map(([table, words], i) => (
              <span key={table}>
                {i > 0 && ', '}
                <a href={href({ format: 'csv', table })}>{words}</a>
              </span>
            ))}
            .
          </p>
        </>
      )}
    </>
  );
}

interface Span {
  readonly from: string;
  readonly to: string;
}

const monthBefore = (to_ms: number): Span => ({
  from: localField(to_ms - DAYS * DAY_MS),
  to: localField(to_ms),
});

const isoOf = (field: string) => new Date(field).toISOString();

function faultOf({ from, to }: { from: string; to: string }): string | null {
  const [a, b] = [new Date(from).getTime(), new Date(to).getTime()];
  if (!Number.isFinite(a) || !Number.isFinite(b))
    return 'Both times are needed, with day and time.';
  return a < b ? null : 'The span ends before it begins.';
}

function Field({
  id,
  words,
  value,
  onInput,
}: {
  id: string;
  words: string;
  value: string;
  onInput(value: string): void;
}) {
  return (
    <span class="entry">
      <label for={id}>{words}</label>
      <input
        id={id}
        type="datetime-local"
        required
        value={value}
        onInput={(event) => onInput(event.currentTarget.value)}
      />
    </span>
  );
}
