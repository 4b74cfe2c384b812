import { INDICATOR_EVENTS } from '../../../core/watch/kinds.js';
import { dateClock, fixed } from '../lib/format.js';
import { api, model } from '../lib/page.js';
import { hrefOf } from '../lib/route.js';
import { type Answer, useAnswer } from '../lib/useAnswer.js';
import { Sign } from './Sign.js';
import {
  figureWords,
  type Since,
  STANDINGS,
  type Standing,
  sigmasOff,
  sinceOf,
  standingOf,
  valueWords,
} from './standing.js';
import type { Indicator, Watch, WatchHistory } from './wire.js';
import { KIND_WORDS, placeOf } from './words.js';

/** Has anything changed since the rock was healthy, where, since when, how sure. */
export function Verdict({
  unit,
  name,
  watched,
}: {
  unit: string;
  name: string;
  watched: Answer<Watch>;
}) {
  const { answer, fault } = watched;
  const changed = answer?.indicators.filter((one) => one.state === 'degraded') ?? [];
  const since = useSince(unit, changed);
  return (
    <section class="rock-verdict" aria-label="Verdict" aria-live="polite">
      <h1 data-changed={changed.length > 0 ? '' : undefined}>{headline(answer, changed, name)}</h1>
      {answer !== null && <Counts watch={answer} />}
      {changed.length > 0 && (
        <ul class="rock-changes">
          {changed.map((one) => (
            <Change
              key={`${one.kind} ${one.subject}`}
              unit={unit}
              indicator={one}
              since={since(one)}
            />
          ))}
        </ul>
      )}
      <Rejected />
      {fault !== null && (
        <p class="fault">{answer === null ? fault : `${fault} What is shown is of before.`}</p>
      )}
    </section>
  );
}

function headline(watch: Watch | null, changed: readonly Indicator[], name: string): string {
  if (watch === null) return `Rock of ${name}`;
  const standings = watch.indicators.map(standingOf);
  if (changed.length > 0) {
    const places = [
      ...new Set(changed.map((one) => placeOf(one.subject.split('/')[0]!, watch.unit))),
    ];
    return `Changed since healthy: ${places.join(' and ')}`;
  }
  if (standings.includes('open')) return 'Nothing is decided, but something may be changing';
  const known = standings.filter((one) => one === 'healthy').length;
  if (known === 0) return 'Not known yet: the healthy values are being learned';
  if (known < standings.length / 2)
    return 'Nothing seen that has changed, but most is not known yet';
  return 'Nothing has changed since healthy';
}

const COUNT_WORDS: Readonly<Record<Standing, string>> = {
  changed: 'changed',
  open: 'not decided',
  healthy: 'as when healthy',
  unknown: 'not known',
};

function Counts({ watch }: { watch: Watch }) {
  const standings = watch.indicators.map(standingOf);
  return (
    <p class="rock-counts">
      {STANDINGS.map((standing) => {
        const count = standings.filter((one) => one === standing).length;
        if (count === 0) return null;
        return (
          <span key={standing} data-standing={standing}>
            <Sign standing={standing} /> {`${count} ${COUNT_WORDS[standing]}`}
          </span>
        );
      })}
      <span class="when">{`of ${watch.indicators.length} indicators, ${dateClock(watch.time)}`}</span>
    </p>
  );
}

/** When each change began and was decided: from its stored course, else from its alert. */
function useSince(unit: string, changed: readonly Indicator[]): (one: Indicator) => Since | null {
  const kinds = [...new Set(changed.map(({ kind }) => kind))].sort().join(',');
  const key = kinds === '' ? null : `${unit} ${kinds} ${model.alarmNews.value}`;
  const { answer } = useAnswer(key, (signal) =>
    api.get<WatchHistory>(api.path(unit, 'watch', 'history'), { kinds, points: 1000 }, signal),
  );
  const alerts = [...model.standing.value, ...model.heldBack.value];
  return (one) => {
    const course = answer?.indicators.find(
      ({ kind, subject }) => kind === one.kind && subject === one.subject,
    );
    const found = course === undefined ? null : sinceOf(answer?.times ?? [], course);
    const id = `${unit}/${INDICATOR_EVENTS[one.kind]}/${one.subject}`;
    const alert = alerts.find((event) => event.id === id);
    if (alert !== undefined) return { began: found?.began ?? null, decided: alert.time };
    return found;
  };
}

function Change({
  unit,
  indicator,
  since,
}: {
  unit: string;
  indicator: Indicator;
  since: Since | null;
}) {
  const off = sigmasOff(indicator);
  const healthy = figureWords(indicator, indicator.healthy);
  const limit = figureWords(indicator, indicator.limit);
  const seen = since?.began ?? since?.decided ?? null;
  return (
    <li>
      <Sign standing="changed" />
      <div>
        <strong>{`${KIND_WORDS[indicator.kind]}, ${placeOf(indicator.subject, unit)}: `}</strong>
        <span>{`${valueWords(indicator)} where ${healthy} is healthy and ${limit} the limit`}</span>
        <small>
          {sinceWords(since)}
          {off !== null && `; ${fixed(off, off < 10 ? 1 : 0)} sigmas from healthy`}
          {seen !== null && (
            <>
              {' · '}
              <a href={hrefOf('rock', `playback/${seen}`)}>see the beds then</a>
            </>
          )}
        </small>
      </div>
    </li>
  );
}

function sinceWords(since: Since | null): string {
  if (since === null) return 'Decided; since when is not stored';
  const { began, decided } = since;
  if (decided === null) return 'Decided before the span that is looked at';
  const sure = `sure since ${dateClock(decided)}`;
  return began === null ? `S${sure.slice(1)}` : `Began after ${dateClock(began)}, ${sure}`;
}

/** Rejected thermocouples are no change of the rock, but of what is seen of it. */
function Rejected() {
  const stores = model.unit.value?.state?.estimate?.stores ?? {};
  const count = Object.values(stores).reduce(
    (sum, { sensors }) => sum + sensors.rejected.length,
    0,
  );
  if (count === 0) return null;
  return (
    <p class="rock-rejected">
      <span aria-hidden="true">× </span>
      <a href={hrefOf('rock', 'thermocouples')}>
        {count === 1 ? '1 thermocouple is rejected' : `${count} thermocouples are rejected`}
      </a>
    </p>
  );
}
