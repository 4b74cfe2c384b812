import { useEffect, useRef, useState } from 'preact/hooks';

/** A value that changes at most every so often: at once after a rest, else when the time is up. */
export function useSettled<T extends string | number | null>(value: T, every_ms: number): T {
  const [settled, setSettled] = useState(value);
  const changed_ms = useRef(Number.NEGATIVE_INFINITY);
  useEffect(() => {
    if (value === settled) return;
    const wait = Math.max(0, changed_ms.current + every_ms - performance.now());
    const timer = window.setTimeout(() => {
      changed_ms.current = performance.now();
      setSettled(value);
    }, wait);
    return () => window.clearTimeout(timer);
  }, [value, settled, every_ms]);
  return settled;
}
