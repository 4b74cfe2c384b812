import { Bed, MEAN } from '../drawing/Bed.js';
import { Beds } from '../drawing/Beds.js';
import { model } from '../lib/page.js';

/** What the operator looks at. */
export function OperatorSheet() {
  const entry = model.unit.value;
  const stores = entry?.definition?.stores ?? [];
  const estimate = entry?.state?.estimate ?? null;
  return (
    <section id="stores" aria-label="Stores">
      <Beds
        stores={stores}
        bedHeight={370}
        each={(store, space) => (
          <article key={store.id} class="store" data-store={store.id}>
            <Bed
              store={store}
              all={stores}
              space={space}
              drawn={{
                mode: estimate?.mode ?? null,
                own: estimate?.stores[store.id] ?? null,
                profile: entry?.state?.profile?.stores[store.id] ?? null,
              }}
              chosen={MEAN}
            />
          </article>
        )}
      />
    </section>
  );
}
