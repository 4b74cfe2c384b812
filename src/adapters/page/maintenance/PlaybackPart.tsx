import { useEffect, useMemo, useRef, useState } from 'preact/hooks';
import { api, model } from '../lib/page.js';
import { hrefOf, route } from '../lib/route.js';
import { useAnswer } from '../lib/useAnswer.js';
import type { StoreDefinition } from '../lib/wire.js';
import { Choices } from '../parts/Choices.js';
import { useSettled } from '../parts/useSettled.js';
import { FrontMap } from './FrontMap.js';
import { drawable, nearest, secondsOf } from './moments.js';
import { PastBeds } from './PastBeds.js';
import { Player } from './Player.js';
import type { PastProfile, Playback } from './wire.js';

const HOUR_MS = 3_600_000;
/** Of a day all that are stored. */
const POINTS = 145;
const SETTLE_MS = 400;
const SPANS = [
  { value: '24', label: '24 h' },
  { value: '72', label: '3 days' },
  { value: '168', label: '7 days' },
  { value: '720', label: '30 days' },
];

/** The span looked at: its length, and the moment in its middle; null ends with the newest estimate. */
interface Span {
  readonly hours: string;
  readonly about_ms: number | null;
}

/** The moment that the address asks for, `#rock/playback/TIME`. */
function asked(): number | null {
  const at = Date.parse(route.value.part.split('/').slice(1).join('/'));
  return Number.isFinite(at) ? at : null;
}

const newest_ms = () => {
  const time = model.unit.peek()?.state?.estimate?.time;
  return time === undefined ? null : Date.parse(time);
};

/** Its ends; it does not reach beyond the newest estimate, which has to be known. */
function endsOf({ hours, about_ms }: Span): { from: string; to: string } {
  const length_ms = Number(hours) * HOUR_MS;
  const newest = newest_ms() ?? Date.now();
  const to_ms = about_ms === null ? newest : Math.min(newest, about_ms + length_ms / 2);
  return { from: new Date(to_ms - length_ms).toISOString(), to: new Date(to_ms).toISOString() };
}

/** The beds as they were: a slider over the stored profiles. */
export function PlaybackPart({
  unit,
  stores,
}: {
  unit: string;
  stores: readonly StoreDefinition[];
}) {
  const wanted = asked();
  const [span, setSpan] = useState<Span>({ hours: '24', about_ms: wanted });
  const [chosen_s, setChosen] = useState<number | null>(wanted === null ? null : wanted / 1000);
  // Each time the span is set anew, "newest" is another time.
  const [tries, setTries] = useState(0);
  const look = (next: Span) => {
    setSpan(next);
    setChosen(next.about_ms === null ? null : next.about_ms / 1000);
    setTries((before) => before + 1);
  };
  const last = useRef(wanted);
  useEffect(() => {
    if (wanted !== null && wanted !== last.current) look({ ...span, about_ms: wanted });
    last.current = wanted;
  }, [wanted]);

  const started = model.unit.value?.state?.estimate != null;
  const key = started ? `${unit} ${span.hours} ${span.about_ms} ${tries}` : null;
  const { answer, fault, asking } = useAnswer(key, (signal) => {
    const query = { ...endsOf(span), points: POINTS, sigma: 'no' };
    return api.get<Playback>(api.path(unit, 'profiles'), query, signal);
  });
  return (
    <>
      <div class="rock-asks">
        <Choices
          legend="Span"
          name="playback-span"
          options={SPANS}
          chosen={span.hours}
          onChoose={(hours) =>
            look({ hours, about_ms: chosen_s === null ? null : chosen_s * 1000 })
          }
        />
        <GoTo onGo={(about_ms) => look({ ...span, about_ms })} />
        <button type="button" onClick={() => look({ ...span, about_ms: null })}>
          To the newest
        </button>
      </div>
      {fault !== null && <p class="fault">{fault}</p>}
      {answer === null && fault === null && (
        <p>{asking ? 'Asking for the profiles.' : 'No estimate of this unit yet.'}</p>
      )}
      {answer !== null && answer.profiles.length === 0 && (
        <p>Nothing was stored in this span. Profiles are kept as long as estimates are.</p>
      )}
      {answer !== null && answer.profiles.length > 0 && (
        <Played
          unit={unit}
          stores={stores}
          playback={answer}
          at_s={chosen_s ?? secondsOf(answer.profiles.at(-1)!)}
          onChoose={setChosen}
        />
      )}
    </>
  );
}

function Played({
  unit,
  stores,
  playback,
  at_s,
  onChoose,
}: {
  unit: string;
  stores: readonly StoreDefinition[];
  playback: Playback;
  at_s: number;
  onChoose(at_s: number): void;
}) {
  const { profiles, every_s } = playback;
  const moment = nearest(profiles, at_s, every_s);
  const time = useSettled(moment?.time ?? null, SETTLE_MS);
  // At rest the moment is asked for once more, with its sigmas.
  const { answer } = useAnswer(time === null ? null : `${unit} ${time}`, (signal) =>
    api.get<PastProfile>(api.path(unit, 'profile'), { time }, signal),
  );
  useEffect(() => {
    if (time === null) return;
    history.replaceState(null, '', `${location.search}${hrefOf('rock', `playback/${time}`)}`);
  }, [time]);
  const shown = useMemo(() => {
    if (moment === null) return null;
    const whole = answer?.time === moment.time ? answer : null;
    const of = (store: string) => {
      const own = whole?.stores[store] ?? moment.stores[store];
      return own === undefined ? null : drawable(own);
    };
    return { ...moment, stores: Object.fromEntries(stores.map(({ id }) => [id, of(id)])) };
  }, [moment, answer, stores]);
  return (
    <>
      <FrontMap playback={playback} stores={stores} at_s={at_s} onChoose={onChoose} />
      <Player playback={playback} at_s={at_s} moment={moment} onChoose={onChoose} />
      <PastBeds stores={stores} moment={shown} />
    </>
  );
}

/** The field keeps its own text: what stands in it when it is sent off is what counts. */
function GoTo({ onGo }: { onGo(at_ms: number): void }) {
  const field = useRef<HTMLInputElement>(null);
  return (
    <form
      class="rock-go"
      onSubmit={(event) => {
        event.preventDefault();
        const at_ms = new Date(field.current?.value ?? '').getTime();
        if (Number.isFinite(at_ms)) onGo(at_ms);
      }}
    >
      <label for="playback-date">Date and time</label>
      <input ref={field} id="playback-date" type="datetime-local" required />
      <button type="submit">Go there</button>
    </form>
  );
}
