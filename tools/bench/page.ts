import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { gzipSync } from 'node:zlib';
import type { Browser } from 'playwright-core';
import { loadSite } from '../../src/config/load.js';
import { pageFolder } from '../../src/daemon/pageFolder.js';
import { demoSite, runDemo } from '../../src/daemon.js';
import { createLog } from '../../src/log.js';
import { openBrowser } from '../../test/adapters/page/browser.js';
import { findProgram, PROGRAMS } from '../../test/support/requirements.js';

const LOADS = 7;
/** Scans of 30 s, every three seconds. */
const SPEED = 10;

const median = (values: readonly number[]): number =>
  [...values].sort((a, b) => a - b)[values.length >> 1] ?? Number.NaN;

/** One visit of somebody who has never been there: nothing is cached. Times in ms from the request. */
async function visit(browser: Browser, url: string): Promise<{ paint: number; figures: number }> {
  const context = await browser.newContext({ viewport: { width: 1280, height: 800 } });
  try {
    const page = await context.newPage();
    await page.addInitScript(() => {
      new MutationObserver((_, seen) => {
        if (document.querySelector('.profile .estimate') === null) return;
        seen.disconnect();
        requestAnimationFrame(() => performance.mark('figures'));
      }).observe(document, { childList: true, subtree: true });
    });
    await page.goto(url);
    await page.waitForFunction(
      () =>
        performance.getEntriesByName('first-contentful-paint').length > 0 &&
        performance.getEntriesByName('figures').length > 0,
    );
    return await page.evaluate(() => ({
      paint: performance.getEntriesByName('first-contentful-paint')[0]!.startTime,
      figures: performance.getEntriesByName('figures')[0]!.startTime,
    }));
  } finally {
    await context.close();
  }
}

/** First paint of the page on loopback, until the beds stand there, and the size of its script. */
export async function benchPage(
  configPath: string,
  line: (what: string, value: string) => void,
): Promise<void> {
  const assets = join(pageFolder(), 'assets');
  const scripts = readdirSync(assets).filter((name) => name.endsWith('.js'));
  const size = scripts.reduce(
    (sum, name) => sum + gzipSync(readFileSync(join(assets, name))).length,
    0,
  );
  line('script of the page, compressed', `${(size / 1000).toFixed(1)} kB (to stay under 150 kB)`);
  const program = findProgram(PROGRAMS.chromium.names);
  if (program === null) {
    line('first paint of the page', 'skipped: no Chromium');
    return;
  }
  const { site, remove } = await demoSite(loadSite(configPath), {
    ...{ http_port: 0, mqtt_port: 0, keep: false },
  });
  const log = createLog({ level: 'silent' });
  const options = { log, version: '0', configPath, speed: SPEED, seed: 1, incidents: false };
  const demo = await runDemo(site, options);
  const browser = await openBrowser(program);
  try {
    const { service } = demo.daemon;
    while ((service.counters().scans ?? 0) < 2) {
      await new Promise((resolve) => setTimeout(resolve, 100));
    }
    const visits: { paint: number; figures: number }[] = [];
    for (let n = 0; n < LOADS; n++) visits.push(await visit(browser, demo.places.url!));
    const paint = visits.map((one) => one.paint);
    const figures = median(visits.map((one) => one.figures));
    line(
      `first paint of the page on loopback, median and longest of ${LOADS}`,
      `${median(paint).toFixed(0)} ms, ${Math.max(...paint).toFixed(0)} ms (to stay under 1 s)`,
    );
    line('  until the beds are drawn, median', `${figures.toFixed(0)} ms`);
  } finally {
    await browser.close();
    await demo.stop();
    remove();
  }
}
