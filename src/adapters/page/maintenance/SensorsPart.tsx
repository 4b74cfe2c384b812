import type { ComponentChildren } from 'preact';
import { useMemo, useState } from 'preact/hooks';
import { dateClock, fixed, percent } from '../lib/format.js';
import { api, model } from '../lib/page.js';
import { useAnswer } from '../lib/useAnswer.js';
import type { StoreDefinition } from '../lib/wire.js';
import { Choices } from '../parts/Choices.js';
import { useSettled } from '../parts/useSettled.js';
import { Scroller } from './Scroller.js';
import {
  filtered,
  type SensorRow,
  type Sort,
  type SortKey,
  sensorRows,
  sorted,
} from './sensorRows.js';
import type { SensorWorth } from './wire.js';
import { VERDICT_WORDS } from './words.js';

const EVERY_MS = 5_000;

/** Every thermocouple: where it is, what it reads, whether it is believed and why not. */
export function SensorsPart({
  unit,
  stores,
}: {
  unit: string;
  stores: readonly StoreDefinition[];
}) {
  const [filter, setFilter] = useState('all');
  const [sort, setSort] = useState<Sort>({ by: 'verdict', down: true });
  const [asked, setAsked] = useState(0);
  const { answer, fault, asking } = useAnswer(asked === 0 ? null : `${unit} ${asked}`, (signal) =>
    api.get<SensorWorth>(api.path(unit, 'sensors'), {}, signal),
  );
  // A table whose figures jump with every scan cannot be read.
  const time = useSettled(model.unit.value?.state?.profile?.time ?? null, EVERY_MS);
  const rows = useMemo(() => {
    const state = model.unit.peek()?.state ?? null;
    return sensorRows(stores, state?.profile ?? null, state?.estimate ?? null, answer);
  }, [stores, time, answer]);
  const shown = sorted(filtered(rows, filter), sort);
  const rejected = filtered(rows, 'rejected').length;
  return (
    <>
      <div class="rock-asks">
        <Choices
          legend="Show"
          name="sensor-filter"
          options={[
            { value: 'all', label: `all ${rows.length}` },
            { value: 'rejected', label: `${rejected} rejected or missing` },
            ...stores.map(({ id }) => ({ value: `store ${id}`, label: `store ${id}` })),
          ]}
          chosen={filter}
          onChoose={setFilter}
        />
        <button type="button" disabled={asking} onClick={() => setAsked(asked + 1)}>
          {asking ? 'Working it out …' : 'What would losing each cost?'}
        </button>
      </div>
      <p class="rock-key" aria-live="polite">
        {fault ??
          (answer === null
            ? `Readings of ${time === null ? '–' : dateClock(time)}. “Apart” is the reading less the estimate of its string at its height. What losing one costs takes some seconds.`
            : `Readings of ${time === null ? '–' : dateClock(time)}. “If lost”: how much the sigma of the store’s charge grows in the hours ahead; of a rejected one, what its repair would change.`)}
      </p>
      <Scroller label="Table of thermocouples">
        <table class="rock-sensors">
          <thead>
            <tr>
              <Head by="id" sort={sort} onSort={setSort}>
                Thermocouple
              </Head>
              <th scope="col">Store, string</th>
              <Head number by="place" sort={sort} onSort={setSort}>
                At [m]
              </Head>
              <Head number by="reading" sort={sort} onSort={setSort}>
                Reads [°C]
              </Head>
              <Head number by="apart" sort={sort} onSort={setSort}>
                Apart [K]
              </Head>
              {answer !== null && (
                <Head number by="worth" sort={sort} onSort={setSort}>
                  If lost [%]
                </Head>
              )}
              <Head by="verdict" sort={sort} onSort={setSort}>
                Verdict, since, evidence
              </Head>
            </tr>
          </thead>
          <tbody>
            {shown.map((row) => (
              <Row key={row.id} row={row} columns={answer === null ? 6 : 7} />
            ))}
          </tbody>
        </table>
      </Scroller>
      {shown.length === 0 && <p>None is rejected or missing.</p>}
    </>
  );
}

function Head({
  by,
  sort,
  onSort,
  number,
  children,
}: {
  by: SortKey;
  number?: boolean;
  sort: Sort;
  onSort(sort: Sort): void;
  children: ComponentChildren;
}) {
  const own = sort.by === by;
  const way = sort.down ? 'descending' : 'ascending';
  return (
    <th scope="col" class={number ? 'number' : undefined} aria-sort={own ? way : 'none'}>
      <button
        type="button"
        onClick={() => onSort({ by, down: own ? !sort.down : by === 'apart' || by === 'worth' })}
      >
        {children}
        <svg viewBox="0 0 10 10" aria-hidden="true">
          {own && <path d={sort.down ? 'M1,3 h8 l-4,5 Z' : 'M1,8 h8 l-4,-5 Z'} />}
        </svg>
      </button>
    </th>
  );
}

/** With the column of worth there are seven. On a phone the evidence has a line of its own. */
function Row({ row, columns }: { row: SensorRow; columns: 6 | 7 }) {
  const { id, store, string, position_m, value_degC, apart_K, rise, repair } = row;
  const evidence = evidenceOf(row);
  return (
    <>
      <tr data-sensor={id} data-verdict={row.verdict ?? undefined}>
        <th scope="row">{id}</th>
        <td>{`${store}, ${string}`}</td>
        <td class="number">{fixed(position_m, 2)}</td>
        <td class="number">{fixed(value_degC, 1)}</td>
        <td class="number">{fixed(apart_K, 1)}</td>
        {columns === 7 && (
          <td class="number">
            {percent(rise, 1)}
            {repair && ' repaired'}
          </td>
        )}
        <td>
          {verdictOf(row)}
          {evidence !== null && <span class="wide"> {evidence}</span>}
        </td>
      </tr>
      {evidence !== null && (
        <tr class="narrow">
          <td colSpan={columns}>{evidence}</td>
        </tr>
      )}
    </>
  );
}

function verdictOf({ verdict, value_degC }: SensorRow): ComponentChildren {
  if (verdict === null) return value_degC === null ? 'no reading now' : 'used';
  return <strong class="rejected-word">{`× ${VERDICT_WORDS[verdict]}`}</strong>;
}

/** Since when, and why; null where it is used. */
function evidenceOf({ verdict, since, evidence }: SensorRow): ComponentChildren {
  if (verdict === null || (since === null && evidence === '')) return null;
  return (
    <>
      {since !== null && `since ${dateClock(since)}`}
      {evidence !== '' && <small class="evidence">{` ${evidence}`}</small>}
    </>
  );
}
