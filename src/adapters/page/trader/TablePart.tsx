import { useEffect, useState } from 'preact/hooks';
import { api, model } from '../lib/page.js';
import { hrefOf } from '../lib/route.js';
import type { UnitDefinition } from '../lib/wire.js';
import { Asking } from './asking.js';
import { figureAt } from './OfferMatrix.js';
import { OfferView, tableRows } from './OfferView.js';
import { Awaited, StandsOn } from './Standing.js';
import { scheduleText } from './scheduleState.js';
import { asText } from './scheduleText.js';
import { OfferForm } from './TableForm.js';
import { csvOf, Take, tabsOf } from './Take.js';
import { bodyOf, certainty, chosen, form, type TableForm } from './tableAsk.js';
import { typedTime } from './times.js';
import type { Offer, OfferTable } from './wire.js';

export const offersAsking = new Asking<OfferTable>();

/** Asks for a table by the form; the words of what is wrong with the form, or null. */
function ask(definition: UnitDefinition, own: TableForm): string | null {
  const body = bodyOf(own, definition);
  if (typeof body === 'string') return body;
  const { unit } = definition;
  void offersAsking.ask(unit, (ended) =>
    api.ahead<OfferTable>(api.path(unit, 'offers'), { body }, ended),
  );
  return null;
}

/** What can be promised: the table of offers, asked once when it is first opened. */
export function TablePart() {
  const [fault, setFault] = useState<string | null>(null);
  const entry = model.unit.value;
  const definition = entry?.definition ?? null;
  const known = entry?.state?.estimate != null;
  const unit = entry?.unit ?? '';
  const asked = offersAsking.of(unit);
  // Never by itself again: not after a fault, nor after somebody gave up.
  const fresh = asked.unit === null;
  useEffect(() => {
    if (definition !== null && known && fresh) ask(definition, { ...form.value, keep: false });
  }, [definition, known, fresh]);
  if (definition === null) return null;
  const again = () => setFault(ask(definition, form.value));
  const { answer: table } = asked;
  return (
    <>
      <OfferForm {...{ definition, fault }} asking={asked.since_ms !== null} onAsk={again} />
      <Awaited asked={asked} usual="about 3 s" onCancel={() => offersAsking.cancel()} />
      {table !== null && (
        <div aria-busy={asked.since_ms !== null}>
          <StandsOn asked={asked} onAsk={again} />
          {table.kept !== null && (
            <p class="kept" role="status">
              Kept as number {table.kept}:{' '}
              <a href={hrefOf('offer', 'promises')}>see the promises</a>
            </p>
          )}
          <OfferView
            table={table}
            certainty={certainty.value}
            onCertainty={(value) => {
              certainty.value = value;
            }}
            chosen={chosen.value}
            onChoose={(choice) => {
              chosen.value = choice;
            }}
            onCheck={(offer) => check(table, offer)}
          />
          <Take
            name={`${unit}-offers.csv`}
            csv={() => csvOf(tableRows(table))}
            text={() => tabsOf(tableRows(table))}
          />
        </div>
      )}
    </>
  );
}

/** Writes the whole blocks of an offer into the schedule, and goes there. */
function check(table: OfferTable, offer: Offer): void {
  const zone = table.limits.connection?.time_zone ?? null;
  const blocks = figureAt(offer, certainty.value)?.whole_blocks.alone ?? 0;
  const start_ms = Date.parse(offer.start);
  const end_ms = start_ms + Math.max(1, blocks) * table.block_s * 1000;
  scheduleText.value = asText([
    {
      mode: 'discharge',
      power_MW_el: offer.power_MW_el,
      from: typedTime(zone, start_ms),
      to: typedTime(zone, end_ms),
    },
  ]);
  location.hash = hrefOf('offer', 'schedule');
}
