/**
 * A part of the history each call of which acts on damage: where one meets it, `mend` is asked, and the
 * call is made again on the part that it gives. Rows that are given one by one cannot be begun again
 * amid them: then it is mended, and the call fails.
 *
 * @param mend gives the same part of a fresh history; null where the failure is no damage, or is acted
 *   on by who called
 */
export function guarded<T extends object>(part: T, mend: (thrown: unknown) => T | null): T {
  const attempt = <R>(act: (on: T) => R): R => {
    try {
      return act(part);
    } catch (thrown) {
      const fresh = mend(thrown);
      if (fresh === null) throw thrown;
      return act(fresh);
    }
  };
  return new Proxy(part, {
    get: (_, name) => {
      const value = attempt((on) => Reflect.get(on, name, on) as unknown);
      if (typeof value !== 'function') return value;
      return (...given: unknown[]) => {
        const call = (on: T) => (Reflect.get(on, name, on) as typeof value).apply(on, given);
        const result: unknown = attempt(call);
        return isIterator(result) ? handedOn(result, mend) : result;
      };
    },
  });
}

function* handedOn(rows: Iterable<unknown>, mend: (thrown: unknown) => unknown) {
  try {
    yield* rows;
  } catch (thrown) {
    mend(thrown);
    throw thrown;
  }
}

function isIterator(value: unknown): value is IterableIterator<unknown> {
  return typeof value === 'object' && value !== null && Symbol.iterator in value && 'next' in value;
}
