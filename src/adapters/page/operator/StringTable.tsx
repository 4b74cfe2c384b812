import { DASH, fixed, withSigma } from '../lib/format.js';
import type { StoreState } from '../lib/wire.js';

const HEADS = ['String', 'Flow factor', 'Front', 'Width', 'Front view, apart'];

const metres = (value: number | null) => (value === null ? DASH : `${fixed(value, 2)} m`);

/** The stream tubes in numbers, and beside them the front view, which is independent of them. */
export function StringTable({ store }: { store: StoreState | null }) {
  return (
    <details class="more">
      <summary>Strings</summary>
      <table>
        <thead>
          <tr>
            {HEADS.map((head) => (
              <th key={head} scope="col">
                {head}
              </th>
            ))}
          </tr>
        </thead>
        <tbody>
          {store?.strings.map((string) => (
            <tr key={string.id} data-string={string.id}>
              <th scope="row">{string.id}</th>
              <td>{withSigma(string.flow_factor, string.flow_factor_sigma, 2)}</td>
              <td>{metres(string.position_m)}</td>
              <td>{metres(string.width_m)}</td>
              <td>{viewWords(store.front_views.find((one) => one.id === string.id))}</td>
            </tr>
          ))}
        </tbody>
      </table>
      <p class="when" data-field="heat-transfer">
        {store !== null &&
          `Heat-transfer factor ${withSigma(store.heat_transfer_factor, store.heat_transfer_factor_sigma, 2)}`}
      </p>
    </details>
  );
}

/** Position by the front view, and how many sigmas it lies from that of the tube. */
function viewWords(view: StoreState['front_views'][number] | undefined): string {
  if (view === undefined || view.position_m === null) return DASH;
  const apart = view.disagreement === null ? '' : `, ${fixed(view.disagreement, 1)} σ`;
  return `${fixed(view.position_m, 2)} m${view.seen ? apart : ', predicted'}`;
}
