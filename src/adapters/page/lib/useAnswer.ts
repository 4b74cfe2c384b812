import { useEffect, useRef, useState } from 'preact/hooks';
import { wordsOf } from './api.js';

export interface Answer<T> {
  /** The newest answer to the present question; while it is asked again, the one before. */
  readonly answer: T | null;
  /** What was wrong with the last try, in words; null where it went well. */
  readonly fault: string | null;
  readonly asking: boolean;
}

/**
 * Asks the server again whenever `key` changes; null asks nothing. An answer that comes after the
 * question has changed is dropped, and its request ended.
 *
 * @param key says all that the question depends on
 * @param keep whether the answer to another key stays while a new one is awaited
 */
export function useAnswer<T>(
  key: string | null,
  ask: (signal: AbortSignal) => Promise<T>,
  keep = true,
): Answer<T> {
  const [state, setState] = useState<Answer<T>>({ answer: null, fault: null, asking: false });
  const latest = useRef(ask);
  latest.current = ask;
  useEffect(() => {
    if (key === null) {
      setState({ answer: null, fault: null, asking: false });
      return;
    }
    const ended = new AbortController();
    setState((before) => ({ answer: keep ? before.answer : null, fault: null, asking: true }));
    latest
      .current(ended.signal)
      .then((answer) => {
        if (!ended.signal.aborted) setState({ answer, fault: null, asking: false });
      })
      .catch((error: unknown) => {
        if (ended.signal.aborted) return;
        setState((before) => ({ answer: before.answer, fault: wordsOf(error), asking: false }));
      });
    return () => ended.abort();
  }, [key, keep]);
  return state;
}
