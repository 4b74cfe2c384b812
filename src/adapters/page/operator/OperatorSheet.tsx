import { Beds } from '../drawing/Beds.js';
import type { UnitEntry } from '../lib/model.js';
import { model } from '../lib/page.js';
import { viewport } from '../parts/viewport.js';
import { Alarms } from './alarms/Alarms.js';
import { useHeadroom, usePresentHours } from './asked.js';
import { Figures } from './Figures.js';
import { HistoryCharts } from './HistoryCharts.js';
import { Hours } from './Hours.js';
import { Legend } from './Legend.js';
import { StoreView } from './StoreView.js';
import { VerdictLine } from './VerdictLine.js';

/** Is all well, and how long still? */
export function OperatorSheet() {
  const entry = model.unit.value;
  const present = usePresentHours(entry);
  const headroom = useHeadroom(entry);
  const key = entry?.unit ?? '';
  return (
    <>
      <h1 class="unseen">{entry === null ? 'Now' : `Now: ${entry.name}`}</h1>
      <VerdictLine />
      <Figures entry={entry} present={present} headroom={headroom} />
      <Alarms />
      <Hours key={`hours ${key}`} entry={entry} present={present} />
      {entry !== null && <Stores entry={entry} />}
      {entry !== null && <HistoryCharts key={`history ${key}`} entry={entry} />}
    </>
  );
}

/** What stands above the beds and below them, in sizes of type and in pixels. */
const AROUND_REM = 26;
const AROUND_PX = 70;

function Stores({ entry }: { entry: UnitEntry }) {
  const { height, rem } = viewport.value;
  const bedHeight = Math.round(Math.min(900, Math.max(280, height - AROUND_REM * rem - AROUND_PX)));
  const stores = entry.definition?.stores ?? [];
  return (
    <section id="stores" aria-labelledby="stores-head" tabIndex={-1}>
      <h2 id="stores-head">Stores</h2>
      <Beds
        stores={stores}
        bedHeight={bedHeight}
        each={(store, space) => (
          <StoreView key={store.id} entry={entry} store={store} all={stores} space={space} />
        )}
      />
      <Legend />
    </section>
  );
}
