import { fileURLToPath } from 'node:url';
import { AxeBuilder } from '@axe-core/playwright';
import type { Page } from 'playwright-core';
import { build } from 'vite';

/** Sheets and parts of the page, by their path in the address. */
export const PARTS = [
  'now',
  'rock/indicators',
  'rock/cycles',
  'rock/playback',
  'rock/strings',
  'rock/thermocouples',
  'rock/report',
  'offer/table',
  'offer/schedule',
  'offer/promises',
  'offer/charge',
] as const;

/** The page where the daemon looks for it: under `npm test` it has just been built. */
export async function pageIsBuilt(): Promise<void> {
  if (process.env.ROCKHOUR_TEST_BUILT) return;
  const here = (path: string) => fileURLToPath(new URL(`../../${path}`, import.meta.url));
  const outDir = here('dist/page');
  const configFile = here('src/adapters/page/vite.config.ts');
  await build({ configFile, logLevel: 'error', build: { outDir, emptyOutDir: true } });
}

/** Goes to a part as one who follows a link. */
export async function goTo(page: Page, path: string): Promise<void> {
  await page.evaluate((hash) => {
    location.hash = hash;
  }, `#${path}`);
  await page.waitForSelector(`main[data-sheet="${path.split('/')[0]}"] h1, main h2`);
}

const TAGS = ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'];

/**
 * What axe-core finds, a line for each place.
 * @param rules only these; all of WCAG 2.2 A and AA and its best practice unless told
 * @param within selector of what is looked at
 */
export async function axeFinds(
  page: Page,
  rules?: readonly string[],
  within = 'html',
): Promise<string[]> {
  const axe = new AxeBuilder({ page }).setLegacyMode().include(within);
  if (rules === undefined) axe.withTags(TAGS);
  else axe.withRules([...rules]);
  const { violations } = await axe.analyze();
  return violations.flatMap(({ id, nodes }) =>
    nodes.map(({ target, failureSummary }) => `${id} ${target.join(' ')}: ${failureSummary}`),
  );
}

/**
 * What comes to lie over the head, or under it where the sheet begins, while the page is scrolled
 * through: a line for each place.
 */
export const headOverlaps = (page: Page): Promise<string[]> =>
  page.evaluate(() => {
    const head = ['.top', '.watchline']
      .map((one) => document.querySelector<HTMLElement>(one)!)
      .find((one) => getComputedStyle(one).position === 'sticky')!;
    const found = new Set<string>();
    const end = document.documentElement.scrollHeight - innerHeight;
    scrollTo(0, 0);
    if (
      document.querySelector('main')!.getBoundingClientRect().top <
      head.getBoundingClientRect().bottom
    )
      found.add('the sheet begins under the head');
    for (let at = 0; ; at += innerHeight / 4) {
      scrollTo(0, Math.min(at, end));
      const { left, right, top, bottom } = head.getBoundingClientRect();
      if (top > innerHeight) found.add('the head is out of sight');
      for (const share of [0.02, 0.2, 0.4, 0.6, 0.8, 0.98])
        for (const height of [0.2, 0.8]) {
          const x = left + share * (right - left);
          const over = document.elementFromPoint(x, top + height * (bottom - top));
          if (over !== null && !head.contains(over))
            found.add(`over the head: ${over.outerHTML.slice(0, 80)}`);
        }
      if (at >= end) break;
    }
    scrollTo(0, 0);
    return [...found];
  });

/** How many pixels the page is wider than its window. */
export const tooWide = (page: Page): Promise<number> =>
  page.evaluate(() => document.documentElement.scrollWidth - innerWidth);
