/** A row of choices of which one holds; works with the arrow keys as radio buttons do. */
export function Choices({
  legend,
  name,
  options,
  chosen,
  onChoose,
}: {
  legend: string;
  /** Name of the radio group, one of its kind in the page. */
  name: string;
  options: readonly { value: string; label: string }[];
  chosen: string;
  onChoose(value: string): void;
}) {
  return (
    <fieldset class="choices">
      <legend>{legend}</legend>
      {options.map(({ value, label }) => (
        <label key={value}>
          <input
            type="radio"
            name={name}
            value={value}
            checked={value === chosen}
            onChange={() => onChoose(value)}
          />
          <span>{label}</span>
        </label>
      ))}
    </fieldset>
  );
}
