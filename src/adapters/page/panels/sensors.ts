import { h, setAttributes, setText } from '../lib/dom.js';
import { dateClock } from '../lib/format.js';
import type { StoreState } from '../lib/wire.js';

/** How many sensors the estimate uses, and the rejected ones with verdict and evidence. */
export function sensorList() {
  const summary = h('summary', { 'data-field': 'sensors' });
  const list = h('ul', { class: 'rejected-list' });
  const element = h('details', { class: 'more' }, summary, list);
  let shown = '';

  return {
    element,
    update(store: StoreState | null): void {
      const rejected = store?.sensors.rejected ?? [];
      const used = store?.sensors.used ?? 0;
      setText(
        summary,
        store === null ? 'Sensors' : `Sensors: ${used} used, ${rejected.length} rejected`,
      );
      setAttributes(element, { 'data-rejected': rejected.length > 0 });
      const key = JSON.stringify(rejected);
      if (key === shown) return;
      shown = key;
      list.replaceChildren(
        ...rejected.map(({ id, verdict, since, evidence }) =>
          h(
            'li',
            {},
            h('strong', {}, `× ${id}`),
            ` ${verdict.replaceAll('_', ' ')} since ${dateClock(since)}: ${evidence}`,
          ),
        ),
      );
      if (rejected.length === 0) list.replaceChildren(h('li', {}, 'none rejected'));
    },
  };
}
