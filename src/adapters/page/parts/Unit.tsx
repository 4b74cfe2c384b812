/** The unit of a quantity; what stands after `_` is its index: `MWh_el`. */
export function Unit({ name }: { name: string }) {
  const [symbol, index] = name.split('_');
  return (
    <span class="unit">
      {` ${symbol}`}
      {index !== undefined && <sub>{index}</sub>}
    </span>
  );
}
