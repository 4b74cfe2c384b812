import { DASH, dateClock, fixed, MODE_WORDS, withSigma } from '../lib/format.js';
import { model } from '../lib/page.js';
import type { StoreDefinition, StoreProfile, StoreState } from '../lib/wire.js';
import { Scroller } from './Scroller.js';
import { StringsPlot } from './StringsPlot.js';

/** The strings of each store in one plot: where one runs ahead, gas has found an easier way. */
export function StringsPart({ stores }: { stores: readonly StoreDefinition[] }) {
  const state = model.unit.value?.state ?? null;
  const estimate = state?.estimate ?? null;
  return (
    <>
      <p class="rock-key">
        {estimate === null
          ? 'No estimate yet.'
          : `Live, ${dateClock(estimate.time)}, ${MODE_WORDS[estimate.mode]}. Below each plot the front of each string: disc and bracket by the bed model, diamond and whiskers (two sigmas) by the front view, which is independent of it.`}
      </p>
      <div class="rock-strings">
        {stores.map((store) => (
          <section key={store.id} aria-label={`Strings of store ${store.id}`}>
            <h2>{`Store ${store.id}`}</h2>
            <OneStore
              store={store}
              own={estimate?.stores[store.id] ?? null}
              profile={state?.profile?.stores[store.id] ?? null}
            />
          </section>
        ))}
      </div>
    </>
  );
}

function OneStore({
  store,
  own,
  profile,
}: {
  store: StoreDefinition;
  own: StoreState | null;
  profile: StoreProfile | null;
}) {
  return (
    <>
      <StringsPlot store={store} own={own} profile={profile} />
      <Scroller label={`Figures of the strings of ${store.id}`}>
        <table>
          <thead>
            <tr>
              <th scope="col">String</th>
              <th scope="col">At radius [m]</th>
              <th scope="col">Flow factor</th>
              <th scope="col">Front [m]</th>
              <th scope="col">Width [m]</th>
              <th scope="col">Front view [m]</th>
              <th scope="col">Apart</th>
            </tr>
          </thead>
          <tbody>
            {store.strings.map(({ id, radius_m }) => {
              const string = own?.strings.find((one) => one.id === id);
              const view = own?.front_views.find((one) => one.id === id);
              return (
                <tr key={id} data-string={id}>
                  <th scope="row">{id}</th>
                  <td>{fixed(radius_m, 1)}</td>
                  <td>{beside(string?.flow_factor, string?.flow_factor_sigma)}</td>
                  <td>{fixed(string?.position_m, 2)}</td>
                  <td>{fixed(string?.width_m, 2)}</td>
                  <td>
                    {beside(view?.position_m, view?.position_sigma_m)}
                    {view !== undefined && !view.seen && view.position_m !== null && ' predicted'}
                  </td>
                  <td>{apartWords(view)}</td>
                </tr>
              );
            })}
          </tbody>
        </table>
      </Scroller>
    </>
  );
}

/** Broken before the sign where there is no room, never after it. */
const beside = (value: number | null | undefined, sigma: number | null | undefined) =>
  withSigma(value, sigma, 2).replace('± ', '±\u00a0');

/** How far the front view stands from the bed model, in sigmas of the difference. */
function apartWords(view: StoreState['front_views'][number] | undefined): string {
  if (view === undefined || view.disagreement === null || !view.seen) return DASH;
  return `${fixed(view.disagreement, 1)}\u00a0σ`;
}
