import { useRef } from 'preact/hooks';
import { model } from '../lib/page.js';

/** The key of a question that is asked only while connected; until then the answer of before stays. */
export function useHeld(key: string | null): string | null {
  const held = useRef(key);
  if (key === null || model.connection.value === 'live') held.current = key;
  return held.current;
}
