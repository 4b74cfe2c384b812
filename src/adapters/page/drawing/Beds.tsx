import type { ComponentChildren } from 'preact';
import type { StoreDefinition } from '../lib/wire.js';
import { useWidth } from '../parts/useWidth.js';
import type { Space } from './frame.js';

const BESIDE_PX = 620;
const GAP_PX = 24;

/**
 * The stores of a unit, side by side where there is room, all to one scale; `each` draws one in the
 * space that it has.
 *
 * @param bedHeight height for the tallest bed side by side [px]; alone it is drawn a little smaller
 */
export function Beds({
  stores,
  bedHeight,
  each,
}: {
  stores: readonly StoreDefinition[];
  bedHeight: number;
  each(store: StoreDefinition, space: Space): ComponentChildren;
}) {
  const { ref, width } = useWidth<HTMLDivElement>();
  const beside = stores.length > 1 && width >= BESIDE_PX;
  const own = beside ? Math.floor((width - GAP_PX * (stores.length - 1)) / stores.length) : width;
  const space: Space = {
    width: own,
    bedHeight: beside ? bedHeight : Math.min(bedHeight, 320),
    beside,
  };
  return (
    <div ref={ref} class={beside ? 'beds beside' : 'beds'}>
      {width > 0 && stores.map((store) => each(store, space))}
    </div>
  );
}
