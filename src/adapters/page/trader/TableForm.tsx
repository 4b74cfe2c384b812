import type { UnitDefinition } from '../lib/wire.js';
import { form, powersText, type TableForm, usualPowers } from './tableAsk.js';

const EVERY: readonly (readonly [string, string])[] = [
  ['15', '15 min'],
  ['30', '30 min'],
  ['60', '1 h'],
  ['120', '2 h'],
  ['240', '4 h'],
];
const BLOCKS: readonly (readonly [string, string])[] = [
  ['15', '15 min'],
  ['30', '30 min'],
  ['60', '1 h'],
];

/** What the offer table is asked for. */
export function OfferForm({
  definition,
  fault,
  asking,
  onAsk,
}: {
  definition: UnitDefinition;
  /** What is wrong with the form, in words. */
  fault: string | null;
  asking: boolean;
  onAsk(): void;
}) {
  const own = form.value;
  const change = (news: Partial<TableForm>) => {
    form.value = { ...form.value, ...news };
  };
  return (
    <form
      class="ask"
      aria-describedby="table-fault"
      onSubmit={(event) => {
        event.preventDefault();
        onAsk();
      }}
    >
      <Field id="offer-powers" label="Powers, MW electric" wide>
        <input
          id="offer-powers"
          name="powers"
          value={own.powers ?? powersText(usualPowers(definition))}
          inputMode="decimal"
          aria-invalid={fault?.startsWith('Powers') ? 'true' : undefined}
          onInput={(event) => change({ powers: event.currentTarget.value })}
        />
      </Field>
      <Field id="offer-closes" label="Earliest start, min from now">
        <input
          id="offer-closes"
          name="closes"
          value={own.closes_before_min}
          inputMode="numeric"
          aria-invalid={fault?.startsWith('Earliest') ? 'true' : undefined}
          onInput={(event) => change({ closes_before_min: event.currentTarget.value })}
        />
      </Field>
      <Field id="offer-count" label="Starts">
        <input
          id="offer-count"
          name="count"
          value={own.count}
          inputMode="numeric"
          aria-invalid={fault?.startsWith('Starts') ? 'true' : undefined}
          onInput={(event) => change({ count: event.currentTarget.value })}
        />
      </Field>
      <Field id="offer-every" label="One every">
        <Select
          id="offer-every"
          name="every"
          options={EVERY.filter(([minutes]) => Number(minutes) % Number(own.block_min) === 0)}
          value={own.every_min}
          onChange={(every_min) => change({ every_min })}
        />
      </Field>
      <Field id="offer-block" label="Blocks of">
        <Select
          id="offer-block"
          name="block"
          options={BLOCKS}
          value={own.block_min}
          onChange={(block_min) =>
            change({
              block_min,
              every_min: String(Math.max(Number(own.every_min), Number(block_min))),
            })
          }
        />
      </Field>
      <details class="more">
        <summary>Prices, to find the certainty worth bidding</summary>
        <div>
          <Field id="offer-shortfall" label="Cost of each MWh electric short, beyond its price">
            <input
              id="offer-shortfall"
              name="shortfall"
              value={own.shortfall}
              inputMode="decimal"
              onInput={(event) => change({ shortfall: event.currentTarget.value })}
            />
          </Field>
          <Field
            id="offer-surplus"
            label="Price of each MWh electric not sold, less its worth kept"
          >
            <input
              id="offer-surplus"
              name="surplus"
              value={own.surplus}
              inputMode="decimal"
              onInput={(event) => change({ surplus: event.currentTarget.value })}
            />
          </Field>
        </div>
      </details>
      <div class="ends-with">
        <label class="keep">
          <input
            type="checkbox"
            checked={own.keep}
            onChange={(event) => change({ keep: event.currentTarget.checked })}
          />
          <span>Keep it as a promise, to be held against delivery</span>
        </label>
        <button type="submit" class="main">
          {asking ? 'Ask this instead' : 'Ask'}
        </button>
      </div>
      <p id="table-fault" class="fault" role="alert">
        {fault ?? ''}
      </p>
    </form>
  );
}

/** A label over what it is of; `id` is that of the field. */
export function Field({
  id,
  label,
  wide,
  children,
}: {
  id: string;
  label: string;
  wide?: boolean;
  children: preact.ComponentChildren;
}) {
  return (
    <div class={wide ? 'field wide' : 'field'}>
      <label for={id}>{label}</label>
      {children}
    </div>
  );
}

export function Select({
  id,
  name,
  options,
  value,
  onChange,
}: {
  id: string;
  name: string;
  options: readonly (readonly [string, string])[];
  value: string;
  onChange(value: string): void;
}) {
  return (
    <select
      id={id}
      name={name}
      value={value}
      onChange={(event) => onChange(event.currentTarget.value)}
    >
      {options.map(([own, label]) => (
        <option key={own} value={own}>
          {label}
        </option>
      ))}
    </select>
  );
}
