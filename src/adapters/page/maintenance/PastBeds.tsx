import { Bed, bedWords, MEAN } from '../drawing/Bed.js';
import { Beds } from '../drawing/Beds.js';
import {
  ageText,
  clock,
  dateClock,
  fixed,
  MODE_WORDS,
  percent,
  QUALITY_WORDS,
  withSigma,
} from '../lib/format.js';
import { model } from '../lib/page.js';
import type { StoreDefinition, StoreProfile } from '../lib/wire.js';
import { Unit } from '../parts/Unit.js';
import type { PlayedMoment } from './wire.js';

export type ShownMoment = Omit<PlayedMoment, 'stores'> & {
  stores: Record<string, StoreProfile | null>;
};

/** The beds of a moment that is past, in a frame of its own that says so beside each of them. */
export function PastBeds({
  stores,
  moment,
}: {
  stores: readonly StoreDefinition[];
  moment: ShownMoment | null;
}) {
  return (
    <section class="rock-past" aria-label="The beds as they were">
      <Heading moment={moment} />
      <Beds
        stores={stores}
        bedHeight={340}
        each={(store, space) => {
          const own = moment?.estimate?.stores[store.id] ?? null;
          const drawn = {
            mode: moment?.estimate?.mode ?? null,
            own,
            profile: moment?.stores[store.id] ?? null,
          };
          return (
            <article key={store.id} data-store={store.id}>
              <h3>
                {store.id}
                <small>
                  {moment === null ? ' nothing stored' : ` as it was at ${clock(moment.time)}`}
                </small>
              </h3>
              <p class="words" data-field="past-front">
                {moment === null ? '–' : bedWords(store, drawn)}
                {own !== null && (
                  <>
                    {`; charge ${percent(own.soc)} %, stored `}
                    <span class="figure">
                      {withSigma(own.stored_MWh_th, own.stored_sigma_MWh_th, 1)}
                      <Unit name="MWh_th" />
                    </span>
                  </>
                )}
              </p>
              <Bed store={store} all={stores} space={space} drawn={drawn} chosen={MEAN} />
            </article>
          );
        }}
      />
    </section>
  );
}

function Heading({ moment }: { moment: ShownMoment | null }) {
  const newest = model.unit.value?.state?.estimate?.time;
  if (moment === null) {
    return (
      <header>
        <h2>Nothing was stored at this time</h2>
        <p class="words">
          The daemon was not running, or no reading came. Step on to the next moment.
        </p>
      </header>
    );
  }
  const { time, estimate, power_MW_el, flow_kg_s } = moment;
  const age_s = newest === undefined ? null : (Date.parse(newest) - Date.parse(time)) / 1000;
  return (
    <header>
      <h2>
        <span class="stamp">Past</span>
        {` As it was at ${dateClock(time)}`}
        {age_s !== null && age_s > 0 && (
          <small>{`, ${ageText(age_s)} before the newest estimate`}</small>
        )}
      </h2>
      <p class="words">
        {estimate === null
          ? 'No estimate is stored with this profile.'
          : `${MODE_WORDS[estimate.mode]}; estimate ${QUALITY_WORDS[estimate.quality]}`}
        {flow_kg_s !== null && `; flow ${fixed(flow_kg_s, 1)} kg/s`}
        {power_MW_el !== null && (
          <>
            {`; ${power_MW_el < 0 ? 'delivered' : 'drawn'} `}
            <span class="figure">
              {fixed(Math.abs(power_MW_el), 2)}
              <Unit name="MW_el" />
            </span>
          </>
        )}
      </p>
    </header>
  );
}
