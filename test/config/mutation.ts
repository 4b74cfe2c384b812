import fc from 'fast-check';

/** Values that people and programs put where they do not belong. */
const junk = fc.oneof(
  fc.constantFrom(null, '', 'x', -1, 0, 1e9, 0.5, true, [], {}, [[]], [1, 'a'], { kind: 'x' }),
  fc.string(),
  fc.double(),
  fc.integer(),
  fc.array(fc.integer(), { maxLength: 3 }),
);

export interface Mutation {
  /** Picks the place: which of all nodes, counted in the order of the file, as a share. */
  readonly at: number;
  readonly how: 'replace' | 'remove' | 'add' | 'repeat';
  readonly value: unknown;
  readonly key: string;
}

export const mutation: fc.Arbitrary<Mutation> = fc.record({
  at: fc.double({ min: 0, max: 1, maxExcluded: true, noNaN: true }),
  how: fc.constantFrom('replace', 'remove', 'add', 'repeat'),
  value: junk,
  key: fc.oneof(fc.string({ minLength: 1 }), fc.constantFrom('height', 'unit', 'password', 'id')),
});

type Holder = Record<string, unknown> | unknown[];

/** Changes one place of a copy of the data. */
export function mutate(data: unknown, { at, how, value, key }: Mutation): unknown {
  const copy: unknown = structuredClone(data);
  const places: (readonly [Holder, string | number])[] = [];
  const walk = (holder: unknown): void => {
    if (holder === null || typeof holder !== 'object') return;
    for (const part of Object.keys(holder)) {
      places.push([holder as Holder, Array.isArray(holder) ? Number(part) : part]);
      walk((holder as Record<string, unknown>)[part]);
    }
  };
  walk(copy);
  const place = places[Math.floor(at * places.length)];
  if (place === undefined) return copy;
  const [holder, part] = place;
  if (Array.isArray(holder)) {
    const index = part as number;
    if (how === 'remove') holder.splice(index, 1);
    else if (how === 'repeat') holder.splice(index, 0, structuredClone(holder[index]));
    else holder[index] = value;
  } else if (how === 'remove') delete holder[part];
  else if (how === 'add')
    Object.defineProperty(holder, key, {
      value,
      enumerable: true,
      configurable: true,
      writable: true,
    });
  else holder[part] = value;
  return copy;
}
