import { useEffect, useState } from 'preact/hooks';

const EVERY_MS = 60_000;

/** Counts minutes while somebody looks: what changes over days is asked for again once in one. */
export function useMinute(): number {
  const [minute, setMinute] = useState(0);
  useEffect(() => {
    const timer = window.setInterval(() => {
      if (!document.hidden) setMinute((before) => before + 1);
    }, EVERY_MS);
    return () => window.clearInterval(timer);
  }, []);
  return minute;
}
