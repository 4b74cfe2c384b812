import { byId, h, s } from '../lib/dom.js';
import type { PageModel } from '../lib/model.js';
import type { StreamState, UnitDefinition } from '../lib/wire.js';
import { storeView } from './store.js';

const BESIDE_PX = 620;

/** The stores of the unit, side by side where there is room, all to one scale. */
export function storesPanel(model: PageModel): () => void {
  const holder = h('div', { class: 'beds' });
  byId('stores').append(holder, legend());
  let drawn: UnitDefinition | null = null;
  let shown: StreamState | null | undefined;
  let views: ReturnType<typeof storeView>[] = [];
  let width = 0;

  function layOut(): void {
    width = holder.clientWidth;
    if (width === 0 || views.length === 0) return;
    const gap = Number.parseFloat(getComputedStyle(holder).columnGap) || 0;
    const beside = views.length > 1 && width >= BESIDE_PX;
    holder.classList.toggle('beside', beside);
    const each = Math.floor(beside ? (width - gap * (views.length - 1)) / views.length : width);
    for (const view of views) view.layOut({ width: each, bedHeight: beside ? 370 : 320, beside });
  }

  new ResizeObserver(() => {
    if (holder.clientWidth !== width) layOut();
  }).observe(holder);

  return () => {
    const entry = model.unit;
    const definition = entry?.definition ?? null;
    if (definition !== drawn) {
      drawn = definition;
      const stores = definition?.stores ?? [];
      views = stores.map((store) => storeView(store, stores));
      holder.replaceChildren(...views.map((view) => view.root));
      layOut();
      shown = undefined;
    }
    const state = entry?.state ?? null;
    if (state === shown) return;
    shown = state;
    for (const view of views) view.update(state);
  };
}

/** What the marks mean; drawn with the same marks. */
function legend(): HTMLElement {
  const item = (mark: SVGElement, text: string) =>
    h('li', {}, s('svg', { width: 22, height: 14, 'aria-hidden': 'true' }, mark), text);
  return h(
    'ul',
    { class: 'legend', 'aria-label': 'Legend' },
    item(s('path', { class: 'key-estimate', d: 'M1,7 H21' }), 'estimate'),
    item(s('rect', { class: 'key-band', x: 1, y: 2, width: 20, height: 10 }), '± 2 sigma'),
    item(s('path', { class: 'key-tube', d: 'M1,7 H21' }), 'each string’s tube'),
    item(s('circle', { class: 'key-used', cx: 11, cy: 7, r: 3 }), 'reading'),
    item(s('path', { class: 'key-rejected', d: 'M7,3 l8,8 m0,-8 l-8,8' }), 'rejected reading'),
    item(s('circle', { class: 'key-missing', cx: 11, cy: 7, r: 3 }), 'missing'),
    item(s('path', { class: 'key-front', d: 'M1,7 H21' }), 'front, 16–84 % width'),
    item(s('rect', { class: 'key-stone', x: 4, y: 1, width: 12, height: 12 }), 'charged rock'),
    item(s('rect', { class: 'key-spent', x: 4, y: 1, width: 12, height: 12 }), 'spent rock'),
  );
}
