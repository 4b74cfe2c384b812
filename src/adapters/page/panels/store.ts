import { type Frame, frameOf, type Ring, ringsOf, type Space } from '../drawing/frame.js';
import { frontMarks, frontWords, travelOf } from '../drawing/front.js';
import { profileLines, shownOf, temperatureScale } from '../drawing/profile.js';
import { Rubble } from '../drawing/rubble.js';
import { gasArrows, strings, tubeFronts, vessel } from '../drawing/section.js';
import { choices, h, s, setAttributes, setText, unitText } from '../lib/dom.js';
import { fixed, REASON_WORDS, withSigma } from '../lib/format.js';
import type { StoreDefinition, StreamState } from '../lib/wire.js';
import { sensorList } from './sensors.js';
import { stringTable } from './strings.js';

const MEAN = '';

/** One store: figures, drawing, choice of string, strings in numbers, rejected sensors. */
export function storeView(store: StoreDefinition, all: readonly StoreDefinition[]) {
  const field = (name: string) => h('span', { 'data-field': name });
  const soc = field('store-soc');
  const stored = field('stored');
  const spread = field('spread');
  const outlet = field('outlet');
  const figures = h(
    'dl',
    { class: 'strip small' },
    pair('Charged', soc, unitText('%')),
    pair('Stored heat', stored, unitText('MWh_th')),
    pair('Spread ratio', spread),
    pair('Outlet', outlet, unitText('°C')),
  );
  if (store.kind === 'cold') setText(figures.querySelectorAll('dt')[1]!, 'Stored cold');
  const drawing = s('svg', { class: 'bed', role: 'img' });
  const words = h('p', { class: 'words', 'data-field': 'front' });
  const table = stringTable();
  const sensors = sensorList();

  let chosen = MEAN;
  let last: StreamState | null = null;
  const picker = choices(
    'Profile of',
    `string-${store.id}`,
    [{ value: MEAN, label: 'mean' }, ...store.strings.map(({ id }) => ({ value: id, label: id }))],
    MEAN,
    (value) => {
      chosen = value;
      update(last);
    },
  );
  const root = h(
    'article',
    { class: 'store', 'data-store': store.id },
    h(
      'h3',
      {},
      `${store.kind === 'hot' ? 'Hot' : 'Cold'} store `,
      h('span', { class: 'id' }, store.id),
    ),
    figures,
    drawing,
    words,
    picker,
    table.element,
    sensors.element,
  );

  let frame: Frame | null = null;
  let rings: Ring[] = [];
  let rubble: Rubble | null = null;
  const moving = s('g');
  const above = s('g');

  const { reference_hot_degC: hot, reference_cold_degC: cold } = store;
  const charged = (degrees: number) => {
    const theta = (degrees - cold) / (hot - cold);
    return store.kind === 'hot' ? theta : 1 - theta;
  };

  /** Draws what does not move, for the space there is. */
  function layOut(space: Space): void {
    frame = frameOf(store, all, space);
    rings = ringsOf(store);
    rubble = new Rubble(frame, rings, charged);
    setAttributes(drawing, {
      width: frame.width,
      height: frame.height,
      viewBox: `0 0 ${frame.width} ${frame.height}`,
    });
    drawing.replaceChildren(
      rubble.element,
      vessel(frame, store),
      temperatureScale(frame, store),
      moving,
      above,
    );
    update(last);
  }

  function update(state: StreamState | null): void {
    last = state;
    const estimate = state?.estimate ?? null;
    const own = estimate?.stores[store.id] ?? null;
    const profile = state?.profile?.stores[store.id] ?? null;
    const percents = (share: number | undefined) => (share === undefined ? null : share * 100);
    setText(soc, withSigma(percents(own?.soc), percents(own?.soc_sigma), 1));
    setText(stored, withSigma(own?.stored_MWh_th, own?.stored_sigma_MWh_th, 2));
    setText(spread, fixed(own?.spread_ratio, 2));
    setText(outlet, fixed(own?.outlet_degC, 1));
    table.update(own);
    sensors.update(own);
    if (frame === null || rubble === null) return;
    const mode = estimate?.mode ?? null;
    const fronts = own?.fronts ?? [];
    const at = frame;
    rubble.update(profile);
    moving.replaceChildren(
      gasArrows(at, mode),
      tubeFronts(at, rings, own),
      strings(at, rings, profile?.readings ?? []),
    );
    above.replaceChildren(...fronts.map((front) => frontMarks(at, front, mode, profile)));
    if (profile !== null) {
      const shown = shownOf(profile, store, chosen);
      above.prepend(profileLines(at, profile, shown, chosen));
    }
    const travel = travelOf(at, mode);
    const told =
      fronts.length > 0
        ? fronts.map((front) => frontWords(front, travel)).join('; ')
        : own?.fronts_reason
          ? REASON_WORDS[own.fronts_reason]
          : 'no estimate yet';
    setText(words, `${told}; positions from the charge inlet at the ${store.charge_inlet_at}`);
    setAttributes(drawing, { 'aria-label': `Bed and temperatures of store ${store.id}: ${told}` });
  }

  return { root, layOut, update };
}

function pair(label: string, value: HTMLElement, unit: HTMLElement | null = null): HTMLElement {
  return h('div', {}, h('dt', {}, label), h('dd', {}, value, unit));
}
