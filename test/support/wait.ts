/**
 * Asks `probe` until it gives something other than false, null or undefined, and returns that.
 * Fails with `what` after the limit, so that a test that waits in vain says for what it waited.
 */
export async function waitFor<T>(
  what: string,
  probe: () => T | false | null | undefined | Promise<T | false | null | undefined>,
  limit_ms = 10_000,
  pause_ms = 20,
): Promise<T> {
  const end = performance.now() + limit_ms;
  for (;;) {
    const found = await probe();
    if (found !== false && found !== null && found !== undefined) return found;
    if (performance.now() > end) throw new Error(`waited ${limit_ms} ms in vain for ${what}`);
    await new Promise((resolve) => setTimeout(resolve, pause_ms));
  }
}
