import type { Page, Request } from 'playwright-core';

/** A sheet, or a part of one that a link within the sheet leads to. */
export interface Place {
  /** As in the address, without the `#`: `rock/playback`. */
  readonly path: string;
  /** The same, as the name of a file. */
  readonly name: string;
}

/** Counts what the page has asked for and not yet been answered, its stream aside. */
export function watchRequests(page: Page): () => number {
  const open = new Set<Request>();
  page.on('request', (one) => {
    if (!one.url().includes('/api/stream')) open.add(one);
  });
  page.on('requestfinished', (one) => open.delete(one));
  page.on('requestfailed', (one) => open.delete(one));
  return () => open.size;
}

/** Waits until the page has its answers and has drawn them; at most so long [ms]. */
export async function settled(page: Page, open: () => number, most_ms = 20_000): Promise<void> {
  const end = performance.now() + most_ms;
  let quiet = 0;
  while (quiet < 4 && performance.now() < end) {
    await page.waitForTimeout(100);
    quiet = open() === 0 ? quiet + 1 : 0;
  }
  await page.evaluate(
    () =>
      new Promise<void>((done) => {
        requestAnimationFrame(() => requestAnimationFrame(() => done()));
      }),
  );
}

/** Goes to a sheet or part as one who follows a link: the page is not loaded again. */
export async function goTo(page: Page, path: string): Promise<void> {
  await page.evaluate((hash) => {
    location.hash = hash;
  }, `#${path}`);
  const sheet = path.split('/')[0];
  await page.waitForSelector(`main[data-sheet="${sheet}"]`);
}

/** All sheets and their parts, as the page itself has links to them. */
export async function placesOf(page: Page, open: () => number): Promise<Place[]> {
  const links = (within: string) =>
    page
      .locator(`${within} a[href^="#"]`)
      .evaluateAll((all) => all.map((one) => one.getAttribute('href')!.slice(1)));
  const paths: string[] = [];
  for (const sheet of await links('#sheets')) {
    await goTo(page, sheet);
    await settled(page, open);
    const parts = (await links('main nav')).filter((path) => path.startsWith(`${sheet}/`));
    // A sheet with parts opens at its first one.
    paths.push(...(parts.length > 0 ? parts : [sheet]));
  }
  return [...new Set(paths)].map((path) => ({ path, name: path.replaceAll('/', '-') }));
}
