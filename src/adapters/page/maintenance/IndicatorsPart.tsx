import { CAUSES } from '../../../core/watch/causeTable.js';
import type { Answer } from '../lib/useAnswer.js';
import { Ruler } from './Ruler.js';
import { Sign } from './Sign.js';
import { byStanding, figureWords, STANDING_WORDS, standingOf, valueWords } from './standing.js';
import type { Indicator, Watch } from './wire.js';
import { KIND_WORDS, partOf, placeOf, REASON_WORDS } from './words.js';

/** Probable causes first, then each indicator, by what it speaks of. */
export function IndicatorsPart({ unit, watched }: { unit: string; watched: Answer<Watch> }) {
  const { answer: watch, fault } = watched;
  if (watch === null) return <p>{fault === null ? 'Being asked for.' : 'Nothing to show.'}</p>;
  const subjects = [...new Set(watch.indicators.map(({ subject }) => subject.split('/')[0]!))];
  // The unit as a whole comes after its stores.
  subjects.sort((a, b) => Number(a === unit) - Number(b === unit));
  return (
    <>
      {watch.causes.length > 0 && <Causes unit={unit} watch={watch} />}
      <p class="rock-key">
        Every scale runs from healthy (thin mark) to the limit (tall mark); whiskers are two sigmas.
        Open a row for the whole sentence.
      </p>
      <div class="rock-indicators">
        {subjects.map((subject) => (
          <Subject
            key={subject}
            title={subject === unit ? 'Unit as a whole' : `Store ${subject}`}
            indicators={watch.indicators.filter((one) => one.subject.split('/')[0] === subject)}
          />
        ))}
      </div>
    </>
  );
}

function Causes({ unit, watch }: { unit: string; watch: Watch }) {
  return (
    <section class="rock-causes" aria-labelledby="causes-title">
      <h2 id="causes-title">Probably behind it, and what to check on site</h2>
      <ol>
        {watch.causes.map(({ cause, subject, probability, evidence, check }, i) => (
          <li key={`${cause} ${subject}`} data-cause={cause}>
            <p class="chance">
              <strong>{`${Math.round(100 * probability)} %`}</strong>
              <svg viewBox="0 0 100 6" preserveAspectRatio="none" aria-hidden="true">
                <rect class="rail" width="100" height="6" />
                <rect width={100 * probability} height="6" />
              </svg>
            </p>
            <div>
              <h3>{`${CAUSES[cause].words}, ${placeOf(subject, unit)}`}</h3>
              <p>{`Check ${check}.`}</p>
              <details open={i === 0}>
                <summary>{`What speaks for and against it (${evidence.length})`}</summary>
                <ul>
                  {evidence.map((line) => (
                    <Evidence key={line} line={line} />
                  ))}
                </ul>
              </details>
            </div>
          </li>
        ))}
      </ol>
    </section>
  );
}

/** `For it: ...`: what it is to the cause stands before the colon. */
function Evidence({ line }: { line: string }) {
  const colon = line.indexOf(':');
  return (
    <li>
      <strong>{line.slice(0, colon + 1)}</strong>
      {line.slice(colon + 1)}
    </li>
  );
}

function Subject({ title, indicators }: { title: string; indicators: readonly Indicator[] }) {
  return (
    <section aria-label={title}>
      <h2>{title}</h2>
      <div class="rock-rows">
        {byStanding(indicators).map((one) => (
          <Row key={`${one.kind} ${one.subject}`} indicator={one} />
        ))}
      </div>
    </section>
  );
}

function Row({ indicator }: { indicator: Indicator }) {
  const { kind, subject, score, reason, sentence } = indicator;
  const standing = standingOf(indicator);
  const part = partOf(subject);
  const why = reason === null ? '' : `: ${REASON_WORDS[reason]}`;
  return (
    <details class="rock-row" data-kind={kind} data-subject={subject} data-standing={standing}>
      <summary>
        <Sign standing={standing} />
        <span class="name">
          {KIND_WORDS[kind]}
          {part !== '' && <small>{` ${part}`}</small>}
          <small class="state">{STANDING_WORDS[standing] + why}</small>
        </span>
        <Ruler indicator={indicator} />
        <span class="value">
          {valueWords(indicator)}
          <small class="limit-words">{` limit ${figureWords(indicator, indicator.limit)}`}</small>
        </span>
      </summary>
      <p>{sentence}</p>
      <p class="when">
        {`Healthy ${figureWords(indicator, indicator.healthy)}${fromWords(indicator)}; `}
        {score === null
          ? 'the test has had no value yet.'
          : `the test has come ${Math.round(100 * score)} % of the way to deciding that it is degraded.`}
      </p>
    </details>
  );
}

function fromWords({ healthy_from }: Indicator): string {
  switch (healthy_from) {
    case 'configured':
      return ' as configured';
    case 'learned':
      return ' as learned here';
    case 'twin':
      return ' by the healthy twin';
    case 'law':
      return ' by law of physics';
    default:
      return '';
  }
}
