import { useState } from 'preact/hooks';
import { api } from '../lib/page.js';
import { hrefOf } from '../lib/route.js';
import { useAnswer } from '../lib/useAnswer.js';
import { type OfferChoice, OfferView, tableRows } from './OfferView.js';
import { csvOf, Take, tabsOf } from './Take.js';
import { typedTime, zoneWords } from './times.js';
import type { OfferTable } from './wire.js';

/** A table that was kept, as it was answered then. */
export function KeptTable({ unit, no }: { unit: string; no: number }) {
  const [certainty, setCertainty] = useState(0.9);
  const [chosen, setChosen] = useState<OfferChoice | null>(null);
  const { answer: table, fault } = useAnswer<OfferTable>(
    `${unit}|${no}`,
    (ended) => api.get(api.path(unit, 'offers', 'history', String(no)), {}, ended),
    false,
  );
  const zone = table?.limits.connection?.time_zone ?? null;
  return (
    <>
      <p>
        <a href={hrefOf('offer', 'promises')}>Back to all promises</a>
      </p>
      <p class="fault" role="alert">
        {fault ?? ''}
      </p>
      {table !== null && (
        <>
          <p class="moved">
            ▲ Table no. {no} as it was answered from the estimate of {typedTime(zone, table.time)} (
            {zoneWords(zone)}): what was said then, not what holds now.
          </p>
          <OfferView
            table={table}
            certainty={certainty}
            onCertainty={setCertainty}
            chosen={chosen}
            onChoose={setChosen}
          />
          <Take
            name={`${unit}-offers-${no}.csv`}
            csv={() => csvOf(tableRows(table))}
            text={() => tabsOf(tableRows(table))}
          />
        </>
      )}
    </>
  );
}
