/**
 * npm run screens: pictures of every sheet of the page and of every part that its links lead to, at
 * 1920x1080, 1280x800 and 390x844, light and dark. They are there to be looked at. The plant is a
 * simulated one of two units in trouble: a thermocouple of one is cut off and acknowledged, one of
 * the other reads 60 K low, an offer table has been kept.
 *
 * Options: --out FOLDER (.screens), --url ADDRESS of a page that runs (else that plant), --hours 14
 * of plant time before the pictures, --only now,rock/playback, --sizes 1280x800, --scheme light or
 * dark alone, --stale (nothing is heard of the plant for an hour first), --lost (the server falls silent
 * before each picture), --plant healthy (one unit without trouble) or empty (one before its first
 * scan), --readme (the few small ones of README.md instead, into fixtures/screens). It shows the page
 * that npm run build made.
 */
import { mkdirSync, writeFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import cliProgress from 'cli-progress';
import type { Page } from 'playwright-core';
import { openBrowser } from '../test/adapters/page/browser.js';
import { freezingProxy } from '../test/adapters/page/freezingProxy.js';
import { findProgram, PROGRAMS } from '../test/support/requirements.js';
import { helpIfAsked } from './help.js';
import { goTo, placesOf, settled, watchRequests } from './page/places.js';
import { OPENED, prepare } from './page/prepare.js';
import { PICTURES, smallPicture } from './page/readmePictures.js';
import { PLANTS, simulatedPlant } from './page/simulatedPlant.js';

helpIfAsked(import.meta.url);

const { values } = parseArgs({
  options: {
    out: { type: 'string' },
    url: { type: 'string' },
    hours: { type: 'string', default: '14' },
    only: { type: 'string' },
    sizes: { type: 'string', default: '1920x1080,1280x800,390x844' },
    scheme: { type: 'string', default: 'light,dark' },
    stale: { type: 'boolean', default: false },
    lost: { type: 'boolean', default: false },
    plant: { type: 'string', default: 'troubled' },
    readme: { type: 'boolean', default: false },
  },
});

function refuse(words: string): never {
  process.stderr.write(`${words}\n`);
  process.exit(2);
}

const hours = Number(values.hours);
if (!(hours > 0)) refuse(`--hours must be a number above 0, got "${values.hours}"`);
if (values.stale && values.url !== undefined) refuse('--stale goes with a plant of its own only');
const kind = PLANTS.find((name) => name === values.plant);
if (kind === undefined) refuse(`--plant is ${PLANTS.join(', ')}; got "${values.plant}"`);
const sizes = values.sizes.split(',').map((text) => {
  const [, width, height] = /^(\d+)x(\d+)$/.exec(text) ?? refuse(`--sizes: "${text}" is no size`);
  return { text, width: Number(width), height: Number(height) };
});
const schemes = values.scheme.split(',').map((text) => {
  if (text !== 'light' && text !== 'dark') refuse(`--scheme is light or dark, got "${text}"`);
  return text;
});
const only = values.only?.split(',');
const root = fileURLToPath(new URL('..', import.meta.url));
const out = values.out ?? (values.readme ? `${root}fixtures/screens` : `${root}.screens`);

const PATIENT_MS = 180_000;
const program =
  findProgram(PROGRAMS.chromium.names) ??
  refuse(`This needs Chromium: install the package ${PROGRAMS.chromium.package}.`);

const shown = process.stderr.isTTY
  ? new cliProgress.SingleBar({ format: '{what} {bar} {value} of {total}' })
  : null;
const plant = values.url === undefined ? await fastForward() : null;
const browser = await openBrowser(program);
try {
  if (values.stale) {
    await plant?.pause();
    await plant?.silence(1);
  }
  const context = await browser.newContext({ viewport: { width: 1280, height: 800 } });
  // A machine that is busy with the plant answers late, but it answers.
  context.setDefaultTimeout(PATIENT_MS);
  const page = await context.newPage();
  const open = watchRequests(page);
  page.on('console', (said) => process.stderr.write(`console: ${said.text()}\n`));
  page.on('pageerror', (error) => process.stderr.write(`error: ${error.message}\n`));
  const url = values.url ?? plant!.url;
  const between = values.lost ? await freezingProxy(Number(new URL(url).port)) : null;
  await page.goto(between?.url ?? url);
  await page.waitForSelector('#freshness:not([data-trust="connecting"])');
  mkdirSync(out, { recursive: true });
  if (values.readme) await readmePictures(page, open);
  else await allPictures(page, open, between);
} finally {
  await browser.close();
  await plant?.stop();
}
process.exit();

async function fastForward() {
  shown?.start(hours, 0, { what: 'hours of the plant' });
  const running = await simulatedPlant(kind!, hours, (done) => shown?.update(Math.round(done)));
  shown?.stop();
  return running;
}

async function allPictures(
  page: Page,
  open: () => number,
  between: Awaited<ReturnType<typeof freezingProxy>> | null,
): Promise<void> {
  const places = (await placesOf(page, open)).filter(({ path }) => only?.includes(path) ?? true);
  shown?.start(places.length, 0, { what: 'sheets and parts' });
  for (const { path, name } of places) {
    await goTo(page, path);
    await prepare(page, path);
    if (between !== null) {
      between.freeze();
      await page.waitForSelector('#freshness[data-trust="lost"]');
    }
    await inAllLooks(page, open, name);
    for (const more of between === null ? (OPENED[path] ?? []) : []) {
      if (!(await more.open(page))) continue;
      await inAllLooks(page, open, more.name, more.whole);
      await page.keyboard.press('Escape');
    }
    if (between !== null) {
      between.thaw();
      await page.waitForSelector('#freshness:not([data-trust="lost"])');
    }
    shown?.increment();
  }
  shown?.stop();
}

async function inAllLooks(page: Page, open: () => number, name: string, whole = true) {
  for (const { text, width, height } of sizes) {
    await page.setViewportSize({ width, height });
    for (const scheme of schemes) {
      await page.emulateMedia({ colorScheme: scheme });
      await settled(page, open);
      // A part that a link leads to is scrolled to; the head would lie over it.
      if (whole) await page.evaluate(() => scrollTo(0, 0));
      const path = `${out}/${name}-${text}-${scheme}.png`;
      await page.screenshot({ path, fullPage: whole });
      const wider = await page.evaluate(() => document.documentElement.scrollWidth - innerWidth);
      if (wider > 0) process.stderr.write(`${name} at ${text} is ${wider} px too wide\n`);
    }
  }
}

async function readmePictures(page: Page, open: () => number): Promise<void> {
  for (const { path, file, width, height, dark } of PICTURES) {
    await page.setViewportSize({ width, height });
    await page.emulateMedia({ colorScheme: dark ? 'dark' : 'light' });
    await goTo(page, path);
    await prepare(page, path);
    await settled(page, open);
    await page.evaluate(() => scrollTo(0, 0));
    const picture = await smallPicture(page);
    writeFileSync(`${out}/${file}`, picture);
    process.stdout.write(`${file} ${(picture.length / 1000).toFixed(0)} kB\n`);
  }
}
