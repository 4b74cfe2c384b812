import { dateClock } from '../lib/format.js';
import type { StoreState } from '../lib/wire.js';

/** How many sensors the estimate uses, and the rejected ones with verdict and evidence. */
export function SensorList({ store }: { store: StoreState | null }) {
  const rejected = store?.sensors.rejected ?? [];
  return (
    <details class="more" data-rejected={rejected.length > 0 ? '' : undefined}>
      <summary data-field="sensors">
        {store === null
          ? 'Sensors'
          : `Sensors: ${store.sensors.used} used, ${rejected.length} rejected`}
      </summary>
      <ul class="rejected-list">
        {rejected.map(({ id, verdict, since, evidence }) => (
          <li key={id}>
            <strong>{`× ${id}`}</strong>
            {` ${verdict.replaceAll('_', ' ')} since ${dateClock(since)}: ${evidence}`}
          </li>
        ))}
        {rejected.length === 0 && <li>none rejected</li>}
      </ul>
    </details>
  );
}
