import { useMemo, useState } from 'preact/hooks';
import { DASH, dateClock, fixed, MODE_WORDS, percent } from '../lib/format.js';
import { api, model } from '../lib/page.js';
import { useAnswer } from '../lib/useAnswer.js';
import type { StoreDefinition } from '../lib/wire.js';
import { Choices } from '../parts/Choices.js';
import { Scroller } from './Scroller.js';
import { useMinute } from './useMinute.js';
import { WeekChart } from './WeekChart.js';
import { indicatorColumns, runColumns, stringColumns } from './weekColumns.js';
import type { Line } from './weekOptions.js';
import type { IndicatorCourse, Run, Runs, WatchHistory } from './wire.js';

const DAY_MS = 86_400_000;
const SPANS = [
  { value: '7', label: '7 days' },
  { value: '30', label: '30 days' },
  { value: '90', label: '90 days' },
  { value: '365', label: 'a year' },
];
const PLACES = [
  { value: '0.25', label: '25 %' },
  { value: '0.5', label: '50 %' },
  { value: '0.75', label: '75 %' },
];
const KINDS = 'spread_ratio,heat_transfer,string_flow';
const DASHES = [[], [9, 4], [2, 3], [9, 3, 2, 3]] as const;

const COURSE_LINES: readonly Line[] = [
  { label: 'value' },
  { label: '' },
  { label: '' },
  { label: 'healthy', soft: true },
  { label: 'limit', soft: true, dash: [6, 3, 1, 3] },
];
const RUN_LINES: readonly Line[] = [
  { label: 'charging', points: 'filled' },
  { label: 'discharging', dash: [6, 4], points: 'hollow' },
];

/** Widths, spread ratios, heat transfer and flow over weeks, store by store. */
export function CyclesPart({ unit, stores }: { unit: string; stores: readonly StoreDefinition[] }) {
  const [days, setDays] = useState('30');
  const [place, setPlace] = useState('0.5');
  const minute = useMinute();
  const started = model.unit.value?.state?.estimate !== undefined;
  const key = started ? `${unit} ${days} ${minute}` : null;
  const runs = useAnswer(key, (signal) =>
    api.get<Runs>(api.path(unit, 'cycles'), { ...spanOf(days), indicators: 'no' }, signal),
  );
  const watch = useAnswer(key, (signal) => {
    const query = { ...spanOf(days), kinds: KINDS, points: 400 };
    return api.get<WatchHistory>(api.path(unit, 'watch', 'history'), query, signal);
  });
  return (
    <>
      <div class="rock-asks">
        <Choices legend="Last" name="span" options={SPANS} chosen={days} onChoose={setDays} />
        <Choices
          legend="Widths at"
          name="place"
          options={PLACES}
          chosen={place}
          onChoose={setPlace}
        />
        <a href={api.href(api.path(unit, 'cycles'), { ...spanOf(days), format: 'csv' })}>
          Runs as CSV
        </a>
      </div>
      {[runs.fault, watch.fault].map(
        (fault) =>
          fault !== null && (
            <p key={fault} class="fault">
              {fault}
            </p>
          ),
      )}
      {runs.answer?.older_left_out && (
        <p class="when">Of more than 500 runs only the newest are drawn.</p>
      )}
      <div class="rock-weeks">
        {stores.map((store) => (
          <StoreWeeks
            key={store.id}
            store={store}
            share={Number(place)}
            runs={runs.answer?.cycles ?? null}
            history={watch.answer}
          />
        ))}
      </div>
      {runs.answer !== null && (
        <RunTable runs={runs.answer.cycles} stores={stores} share={Number(place)} />
      )}
    </>
  );
}

/** The span that ends with the newest estimate. */
function spanOf(days: string): { from?: string; to?: string } {
  const time = model.unit.peek()?.state?.estimate?.time;
  if (time === undefined) return {};
  return { from: new Date(Date.parse(time) - Number(days) * DAY_MS).toISOString(), to: time };
}

function StoreWeeks({
  store,
  share,
  runs,
  history,
}: {
  store: StoreDefinition;
  share: number;
  runs: readonly Run[] | null;
  history: WatchHistory | null;
}) {
  const widths = useMemo(
    () => runs && runColumns(runs, ['charge', 'discharge'], (run) => widthOf(run, store.id, share)),
    [runs, store.id, share],
  );
  const empty = runs === null ? 'Being asked for.' : 'No run in this span has told it.';
  return (
    <section aria-label={`Store ${store.id} over weeks`}>
      <h2>{`Store ${store.id}`}</h2>
      <WeekChart
        id={`${store.id} width`}
        title={`Width of the front where it passed ${percent(share, 0)} % of the length [m]`}
        lines={RUN_LINES}
        data={widths}
        empty={empty}
      />
      <CourseChart
        history={history}
        kind="spread_ratio"
        store={store.id}
        title="Spread ratio: width over that of the healthy twin"
      />
      <CourseChart
        history={history}
        kind="heat_transfer"
        store={store.id}
        title="Heat-transfer factor"
      />
      <FlowChart history={history} store={store} />
    </section>
  );
}

function widthOf(run: Run, store: string, share: number): number | null {
  const own = run.stores[store]?.widths.find((one) => Math.abs(one.share - share) < 0.01);
  return own?.width_m ?? null;
}

const coursesOf = (history: WatchHistory | null, kind: IndicatorCourse['kind'], store: string) =>
  history?.indicators.filter((one) => one.kind === kind && one.subject.split('/')[0] === store) ??
  [];

const emptyWords = (history: WatchHistory | null) =>
  history === null ? 'Being asked for.' : 'Nothing of it is stored in this span.';

function CourseChart({
  history,
  kind,
  store,
  title,
}: {
  history: WatchHistory | null;
  kind: 'spread_ratio' | 'heat_transfer';
  store: string;
  title: string;
}) {
  const data = useMemo(() => {
    const [course] = coursesOf(history, kind, store);
    const known = course?.value.some((value) => value !== null);
    return history === null || course === undefined || !known
      ? null
      : indicatorColumns(history, course);
  }, [history, kind, store]);
  return (
    <WeekChart
      id={`${store} ${kind}`}
      title={`${title}; band of two sigmas`}
      lines={COURSE_LINES}
      band={[2, 3]}
      data={data}
      empty={emptyWords(history)}
    />
  );
}

function FlowChart({ history, store }: { history: WatchHistory | null; store: StoreDefinition }) {
  const courses = coursesOf(history, 'string_flow', store.id);
  const names = courses.map(({ subject }) => subject.split('/')[1] ?? subject);
  const data = useMemo(() => {
    const own = coursesOf(history, 'string_flow', store.id);
    const known = own.some(({ value }) => value.some((one) => one !== null));
    return history === null || !known ? null : stringColumns(history, own);
  }, [history, store.id]);
  const limit: Line = { label: 'limit', soft: true, dash: [6, 3, 1, 3] };
  return (
    <WeekChart
      id={`${store.id} string_flow`}
      title="Flow of each string over its healthy share"
      lines={[
        ...names.map((label, k) => ({ label, dash: DASHES[k % DASHES.length] ?? [] })),
        { label: 'healthy', soft: true },
        limit,
        limit,
      ]}
      digits={3}
      data={data}
      empty={emptyWords(history)}
    />
  );
}

/** The runs in figures, newest first. */
function RunTable({
  runs,
  stores,
  share,
}: {
  runs: readonly Run[];
  stores: readonly StoreDefinition[];
  share: number;
}) {
  return (
    <details class="more rock-runs">
      <summary>{`The ${runs.length} runs in figures`}</summary>
      <Scroller label="Runs in figures">
        <table>
          <thead>
            <tr>
              <th scope="col">Run</th>
              <th scope="col">From</th>
              <th scope="col">To</th>
              {stores.map(({ id }) => (
                <th key={id} scope="col">
                  {`${id}: charge, width, spread, heat transfer`}
                </th>
              ))}
            </tr>
          </thead>
          <tbody>
            {[...runs].reverse().map((run) => (
              <tr key={run.no}>
                <th scope="row">{`${run.no} ${MODE_WORDS[run.kind]}`}</th>
                <td>{dateClock(run.from)}</td>
                <td>{dateClock(run.to)}</td>
                {stores.map(({ id }) => (
                  <td key={id}>{runWords(run, id, share)}</td>
                ))}
              </tr>
            ))}
          </tbody>
        </table>
      </Scroller>
    </details>
  );
}

function runWords(run: Run, store: string, share: number): string {
  const own = run.stores[store];
  if (own === undefined) return DASH;
  const at = own.widths.find((one) => Math.abs(one.share - share) < 0.01);
  const charge = `${percent(own.soc_from, 0)} to ${percent(own.soc_to, 0)} %`;
  const width = `${fixed(at?.width_m, 2)} m`;
  const factor = fixed(own.heat_transfer_factor, 2);
  return `${charge}, ${width}, ${fixed(at?.spread_ratio, 2)}, ${factor}`;
}
