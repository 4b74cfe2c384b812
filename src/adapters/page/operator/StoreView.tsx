import { useState } from 'preact/hooks';
import { Bed, bedWords, type Drawn, MEAN } from '../drawing/Bed.js';
import type { Space } from '../drawing/frame.js';
import { fixed, withSigma } from '../lib/format.js';
import type { UnitEntry } from '../lib/model.js';
import type { StoreDefinition } from '../lib/wire.js';
import { Choices } from '../parts/Choices.js';
import { Unit } from '../parts/Unit.js';
import { SensorList } from './SensorList.js';
import { StringTable } from './StringTable.js';

const inPercent = (share: number | undefined) => (share === undefined ? null : share * 100);

/** One store: figures, drawing, choice of string, and on asking strings and rejected sensors. */
export function StoreView({
  entry,
  store,
  all,
  space,
}: {
  entry: UnitEntry;
  store: StoreDefinition;
  all: readonly StoreDefinition[];
  space: Space;
}) {
  const [chosen, setChosen] = useState<string>(MEAN);
  const estimate = entry.state?.estimate ?? null;
  const own = estimate?.stores[store.id] ?? null;
  const drawn: Drawn = {
    mode: estimate?.mode ?? null,
    own,
    profile: entry.state?.profile?.stores[store.id] ?? null,
  };
  return (
    <article class="store" data-store={store.id}>
      <h3>
        {store.kind === 'hot' ? 'Hot' : 'Cold'} store <span class="id">{store.id}</span>
      </h3>
      <dl class="strip small">
        <Pair
          label="Charged"
          field="store-soc"
          value={withSigma(inPercent(own?.soc), inPercent(own?.soc_sigma), 1)}
          unit="%"
        />
        <Pair
          label={store.kind === 'hot' ? 'Stored heat' : 'Stored cold'}
          field="stored"
          value={withSigma(own?.stored_MWh_th, own?.stored_sigma_MWh_th, 2)}
          unit="MWh_th"
        />
        <Pair label="Spread ratio" field="spread" value={fixed(own?.spread_ratio, 2)} />
        <Pair label="Outlet" field="outlet" value={fixed(own?.outlet_degC, 1)} unit="°C" />
      </dl>
      <Bed store={store} all={all} space={space} drawn={drawn} chosen={chosen} />
      <p class="words" data-field="front">
        {`${bedWords(store, drawn)}; positions from the charge inlet at the ${store.charge_inlet_at}`}
      </p>
      <Choices
        legend="Profile of"
        name={`string-${store.id}`}
        options={[
          { value: MEAN, label: 'mean' },
          ...store.strings.map(({ id }) => ({ value: id, label: id })),
        ]}
        chosen={chosen}
        onChoose={setChosen}
      />
      <SensorList store={own} />
      <StringTable store={own} />
    </article>
  );
}

function Pair({
  label,
  field,
  value,
  unit,
}: {
  label: string;
  field: string;
  value: string;
  unit?: string;
}) {
  return (
    <div>
      <dt>{label}</dt>
      <dd>
        <span data-field={field}>{value}</span>
        {unit !== undefined && <Unit name={unit} />}
      </dd>
    </div>
  );
}
