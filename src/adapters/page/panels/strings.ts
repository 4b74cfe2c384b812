import { h, setText } from '../lib/dom.js';
import { DASH, fixed, withSigma } from '../lib/format.js';
import type { StoreState } from '../lib/wire.js';

const HEADS = ['String', 'Flow factor', 'Front', 'Width', 'Front view, apart'];

/** The stream tubes in numbers, and beside them the front view, which is independent of them. */
export function stringTable() {
  const body = h('tbody');
  const heat = h('p', { class: 'when', 'data-field': 'heat-transfer' });
  const element = h(
    'details',
    { class: 'more', open: true },
    h('summary', {}, 'Strings'),
    h(
      'table',
      {},
      h('thead', {}, h('tr', {}, ...HEADS.map((head) => h('th', { scope: 'col' }, head)))),
      body,
    ),
    heat,
  );
  const rows = new Map<string, HTMLTableCellElement[]>();

  function cellsOf(id: string): HTMLTableCellElement[] {
    let cells = rows.get(id);
    if (cells === undefined) {
      cells = [1, 2, 3, 4].map(() => h('td'));
      rows.set(id, cells);
      body.append(h('tr', { 'data-string': id }, h('th', { scope: 'row' }, id), ...cells));
    }
    return cells;
  }

  return {
    element,
    update(store: StoreState | null): void {
      for (const string of store?.strings ?? []) {
        const [factor, front, width, view] = cellsOf(string.id);
        const seen = store?.front_views.find((one) => one.id === string.id);
        setText(factor!, withSigma(string.flow_factor, string.flow_factor_sigma, 2));
        setText(front!, string.position_m === null ? DASH : `${fixed(string.position_m, 2)} m`);
        setText(width!, string.width_m === null ? DASH : `${fixed(string.width_m, 2)} m`);
        setText(view!, viewWords(seen));
      }
      setText(
        heat,
        store === null
          ? ''
          : `Heat-transfer factor ${withSigma(store.heat_transfer_factor, store.heat_transfer_factor_sigma, 2)}`,
      );
    },
  };
}

/** Position by the front view, and how many sigmas it lies from that of the tube. */
function viewWords(view: StoreState['front_views'][number] | undefined): string {
  if (view === undefined || view.position_m === null) return DASH;
  const apart = view.disagreement === null ? '' : `, ${fixed(view.disagreement, 1)} σ`;
  return `${fixed(view.position_m, 2)} m${view.seen ? apart : ', predicted'}`;
}
