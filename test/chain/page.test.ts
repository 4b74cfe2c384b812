import type { Browser, Page } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import {
  dateClock,
  fixed,
  hoursText,
  MODE_WORDS,
  percent,
} from '../../src/adapters/page/lib/format.js';
import { watchRequests } from '../../tools/page/places.js';
import { field, openBrowser, openPage } from '../adapters/page/browser.js';
import { rockhour } from '../support/cli.js';
import { DrivenPlant } from '../support/drivenPlant.js';
import { requireProgram } from '../support/requirements.js';
import { type Service, startMosquitto } from '../support/services.js';
import { waitFor } from '../support/wait.js';
import { axeFinds, goTo, headOverlaps, PARTS, pageIsBuilt, tooWide } from './pageChain.js';
import { reverseProxy } from './reverseProxy.js';

/**
 * The page as people have it: real Chromium before the daemon, which has its readings from a
 * simulated plant through mosquitto. One plant, one browser and one page for all, in the order of a
 * shift; a thermocouple of the plant is cut off.
 */
const chromium = requireProgram('chromium');
const mosquitto = requireProgram('mosquitto');
const CUT = 'hot_axis_03';
const ALERT = `vellmoor/sensor_rejected/${CUT}`;
const HOURS = 1.5;
const SCAN_H = 30 / 3600;
const SIZES = [
  { width: 1920, height: 1080 },
  { width: 1280, height: 800 },
  { width: 390, height: 844 },
];

describe.skipIf(!chromium || !mosquitto)('the page before a running daemon', () => {
  let broker: Service;
  let plant: DrivenPlant;
  let browser: Browser;
  let page: Page;
  let open: () => number;
  let opened: Awaited<ReturnType<typeof openPage>>;

  beforeAll(async () => {
    await pageIsBuilt();
    broker = await startMosquitto(mosquitto!);
    plant = await DrivenPlant.start({
      ...{ broker: broker.url, hours: HOURS + 1, cells: 40, incidents: false },
    });
    plant.spoil = (_, values) => ({ ...values, [CUT]: null });
    [browser] = await Promise.all([openBrowser(chromium!), plant.run(HOURS)]);
    opened = await openPage(browser, plant.url);
    page = opened.page;
    open = watchRequests(page);
    await page.waitForSelector('#freshness[data-trust="live"], #freshness[data-trust="degraded"]');
  }, 300_000);

  afterAll(async () => {
    await browser?.close();
    await plant?.stop();
    await broker?.stop();
  });

  // biome-ignore lint/suspicious/noExplicitAny: what a client sees, unknown beforehand
  async function api(path: string): Promise<any> {
    const answer = await fetch(`${plant.url}api/${path}`);
    return answer.json();
  }
  const text = (name: string, within?: string) => field(page, name, within).first().textContent();
  /** What of the page answers a question that it puts while `act` goes on. */
  async function answerTo(path: string, act: () => Promise<unknown>) {
    const [answer] = await Promise.all([
      page.waitForResponse((one) => new URL(one.url()).pathname.endsWith(path), {
        timeout: 60_000,
      }),
      act(),
    ]);
    return answer.json();
  }

  const submit = () => page.locator('form:has(textarea) button[type="submit"]').click();
  /** No answer is awaited any more. */
  const quiet = () => waitFor('answers', () => open() === 0, 20_000, 100);

  it.each(SIZES)('shows what the API says at this moment, at $width x $height', async (size) => {
    await page.setViewportSize(size);
    await goTo(page, 'now');
    const { estimate, dispatch, power_MW_el, flow_kg_s } = await api('units/vellmoor');
    expect(estimate.mode).toBe('charge');
    await expect.poll(() => text('soc')).toBe(percent(estimate.state_of_charge));
    expect(await text('mode')).toBe(MODE_WORDS.charge);
    expect(await text('power')).toBe(fixed(power_MW_el, 2));
    expect(await text('flow')).toBe(fixed(flow_kg_s, 1));
    const [rated, part] = dispatch.answers;
    expect(await text('dispatchable')).toBe(fixed(rated.energy_MWh_el.p90, 2));
    expect(await text('firm-hours')).toBe(hoursText(rated.hours.p90));
    for (const answer of [rated, part]) {
      const row = `.configured [data-power="${answer.power_MW}"]`;
      expect(await text('p50', row)).toBe(hoursText(answer.hours.p50));
    }
    for (const id of ['hot', 'cold']) {
      const { soc, fronts } = estimate.stores[id];
      const store = `[data-store="${id}"]`;
      expect(fronts.length).toBeGreaterThan(0);
      for (const { position_m } of fronts) {
        expect(await text('front', store)).toContain(`front ${fixed(position_m, 2)} `);
      }
      expect(await text('store-soc', store)).toMatch(new RegExp(`^${percent(soc)} `));
    }
    expect(await page.locator('.events li').count()).toBe((await api('alarms')).standing.length);
  });

  it('follows the plant by itself', async () => {
    const before = await text('soc');
    await plant.run(12 * SCAN_H);
    const { estimate } = await api('units/vellmoor');
    await expect.poll(() => text('soc')).toBe(percent(estimate.state_of_charge));
    expect(await text('soc')).not.toBe(before);
    expect(await page.locator('#banner').isHidden()).toBe(true);
  });

  it('says of each part of the rock what the API says', async () => {
    await page.setViewportSize(SIZES[1]!);
    const watch = await api('units/vellmoor/watch');
    await goTo(page, 'rock/indicators');
    await expect.poll(() => page.locator('.rock-row').count()).toBe(watch.indicators.length);
    const flow = watch.indicators.find((one: { kind: string }) => one.kind === 'string_flow');
    const row = `.rock-row[data-kind="string_flow"][data-subject="${flow.subject}"]`;
    expect(await page.locator(`${row} > p`).first().textContent()).toBe(flow.sentence);
    await goTo(page, 'rock/thermocouples');
    await page.locator(`[data-sensor="${CUT}"][data-verdict]`).waitFor();
    const { stores } = await api('units/vellmoor/profile');
    const used = stores.cold.readings[0];
    await expect
      .poll(() => page.locator(`[data-sensor="${used.id}"]`).textContent())
      .toContain(fixed(used.value_degC, 1));
    await goTo(page, 'rock/report');
    const report = page.locator('a[href*="report"]').first();
    const answer = await fetch((await report.evaluate((one: HTMLAnchorElement) => one.href))!);
    expect(answer.status).toBe(200);
  });

  it('plays back what was stored, by the keyboard', async () => {
    await goTo(page, 'rock/playback');
    const slider = page.locator('.rock-player input[type="range"]');
    await slider.focus();
    await page.keyboard.press('Home');
    const { profiles } = await api('units/vellmoor/profiles?sigma=no');
    expect(profiles.length).toBeGreaterThan(HOURS * 6 - 2);
    for (const { time, estimate } of profiles.slice(0, 2)) {
      await expect
        .poll(() => page.locator('.rock-past h2').textContent())
        .toContain(`Past As it was at ${dateClock(time)}`);
      for (const id of ['hot', 'cold']) {
        const told = text('past-front', `.rock-past [data-store="${id}"]`);
        expect(await told).toContain(`charge ${percent(estimate.stores[id].soc)} %`);
      }
      await page.locator('[aria-label="One stored moment on"]').press('Enter');
    }
    // The address says which moment it is: it can be passed on.
    await page.waitForURL(/#rock\/playback\/20\d\d-/);
  });

  it('offers what the API offers, and says which schedule falls short, where and what would hold', async () => {
    await goTo(page, 'offer/schedule');
    const hour = (hours: number) => new Date(plant.time_ms + hours * 3.6e6).toISOString();
    await page.fill(
      'textarea[name="schedule"]',
      `${hour(1)}, ${hour(2)}, 1.2\n${hour(2)}, ${hour(14)}, 1.8`,
    );
    const check = await answerTo('/schedule', () => submit());
    expect(check.probability).toBeLessThan(check.certainty);
    await page.waitForSelector('[data-field="verdict"]');
    expect(await text('verdict')).toContain('Does not hold');
    expect(await text('first-short')).toContain(
      `${fixed(check.first_shortfall.certain.MWh_el, 2)} MWhel lacking`,
    );
    const rows = page.locator('.schedule-view table tr[data-short]');
    const short = check.blocks.filter(
      (one: { met_probability: number }) => one.met_probability < check.certainty,
    );
    expect(await rows.count()).toBe(short.length);
    expect(await page.locator('.schedule-view svg, .schedule-view canvas').count()).toBeGreaterThan(
      0,
    );
    await goTo(page, 'offer/table');
    const table = await answerTo('/offers', () => page.click('form.ask button[type="submit"]'));
    const [first] = table.offers;
    const cell = `[data-power="${first.power_MW_el}"] td:nth-of-type(1)`;
    const figure = first.at.find(({ certainty }: { certainty: number }) => certainty === 0.9);
    await expect.poll(() => text('energy', cell)).toBe(fixed(figure.energy_MWh_el, 2));
  });

  /** A part is drawn: no question is open, and its charts have the width that there is. */
  async function drawn(): Promise<void> {
    await quiet();
    await page.evaluate(
      () => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done))),
    );
  }

  it('fits every part at the three sizes, free of its head, and axe-core finds nothing, light or dark', async () => {
    const found: Record<string, string[]> = {};
    expect((await api('alarms')).standing).not.toEqual([]);
    for (const part of PARTS) {
      await goTo(page, part);
      // Head and foot are the same on all.
      const within = part === 'now' ? 'body' : 'main';
      for (const size of [...SIZES, { width: 320, height: 844 }]) {
        const place = `${part} at ${size.width}`;
        await page.setViewportSize(size);
        await drawn();
        await waitFor('the width', async () => (await tooWide(page)) <= 0, 3000).catch(() => {
          found[place] = ['wider than its window'];
        });
        if (size.width === 320) continue;
        found[`${place}, head`] = await headOverlaps(page);
        // Of one page at another size only these can differ; colours only where its pieces stand otherwise.
        const alone = part === 'now' ? ['target-size', 'color-contrast'] : ['target-size'];
        const rules = size.width === 1280 ? undefined : alone;
        found[place] = await axeFinds(page, rules, rules === undefined ? 'html' : within);
        if (size.width !== 1280) continue;
        await page.emulateMedia({ colorScheme: 'dark' });
        found[`${place}, dark`] = await axeFinds(page, ['color-contrast'], within);
        await page.emulateMedia({ colorScheme: 'light' });
      }
    }
    await page.setViewportSize(SIZES[1]!);
    expect(Object.entries(found).filter(([, all]) => all.length > 0)).toEqual([]);
    expect(opened.said).toEqual([]);
  }, 120_000);

  it('has an alert acknowledged and shelved, which every other way then tells', async () => {
    await goTo(page, 'now');
    const alert = page.locator(`.events li[data-id="${ALERT}"]`);
    const { standing } = await api('alarms');
    expect(standing.map(({ id }: { id: string }) => id)).toContain(ALERT);
    // Its first sentence in sight, the rest with what to do.
    const { message } = standing.find(({ id }: { id: string }) => id === ALERT);
    const seen = (await alert.locator('.message').textContent())!;
    const rest = await alert.locator('.why dd').first().textContent();
    expect(seen.length).toBeGreaterThan(20);
    expect(`${seen} ${rest}`).toBe(message);
    await page.fill('#who', 'night shift');
    await alert.locator('[data-action="acknowledge"]').click();
    await page.waitForSelector(`.events li[data-id="${ALERT}"][data-state="acknowledged"]`);
    await alert.locator('[data-action="shelve"]').click();
    await page.fill('#hide-why', 'cable being drawn');
    await page.fill('#hide-hours', '2');
    await page.keyboard.press('Enter');
    await page.waitForSelector(`.held-back li[data-id="${ALERT}"]`, { state: 'attached' });
    expect(await alert.count()).toBe(0);
    const { suppressed } = await api('alarms');
    expect(suppressed).toMatchObject([
      { id: ALERT, state: 'shelved', shelved: { by: 'night shift', why: 'cable being drawn' } },
    ]);
    const told = await rockhour(['alarms', '--url', plant.url.replace(/\/$/, '')]);
    expect(told.code).toBe(0);
    expect(told.stdout).toContain('shelved');
    expect(told.stdout).toContain('cable being drawn');
  });

  const trusted = (trust: string) =>
    page.waitForSelector(`#freshness[data-trust="${trust}"]`, { timeout: 20_000 });

  it('says that the data are stale once nothing is heard, and when they are well again', async () => {
    await plant.silence(0.25);
    await trusted('stale');
    const { age_s } = await api('units/vellmoor');
    expect(age_s).toBeGreaterThan(0.2 * 3600);
    expect(await page.locator('#banner').textContent()).toMatch(/^The readings are stale\. /);
    expect(await text('age')).toMatch(/1\d min \d\d s old/);
    await plant.run(4 * SCAN_H);
    await page.waitForSelector('#freshness[data-trust="live"], #freshness[data-trust="degraded"]');
    expect(await page.locator('#banner').isHidden()).toBe(true);
  });

  it('goes stale where the broker is lost, and goes on by itself where that is back', async () => {
    await broker.stop();
    await waitFor('the loss', async () => !(await api('health')).ok);
    await plant.silence(0.25);
    await trusted('stale');
    await broker.start();
    await waitFor('the broker', async () => (await api('health')).parts[0].ok);
    await plant.run(4 * SCAN_H);
    await page.waitForSelector('#freshness[data-trust="live"], #freshness[data-trust="degraded"]');
    const { estimate } = await api('units/vellmoor');
    await expect.poll(() => text('soc')).toBe(percent(estimate.state_of_charge));
  });

  it('works below a path of a reverse proxy, live updates too', async () => {
    const proxy = await reverseProxy(plant.url, '/stores/one/');
    const through = await openPage(browser, `${proxy.url}#now`);
    try {
      const { estimate } = await api('units/vellmoor');
      const soc = () => field(through.page, 'soc').first().textContent();
      await expect.poll(soc).toBe(percent(estimate.state_of_charge));
      await plant.run(12 * SCAN_H);
      const after = (await api('units/vellmoor')).estimate.state_of_charge;
      expect(percent(after)).not.toBe(percent(estimate.state_of_charge));
      await expect.poll(soc).toBe(percent(after));
      await goTo(through.page, 'rock/playback');
      await through.page.waitForSelector('.rock-past svg');
      expect(proxy.asked.filter((path) => !path.startsWith('/stores/one/'))).toEqual([]);
      expect([...through.said, ...through.foreign]).toEqual([]);
    } finally {
      await through.close();
      await proxy.close();
    }
  });

  it('has said nothing to the console in all this and asked nobody else', () => {
    expect(opened.said).toEqual([]);
    expect(opened.foreign).toEqual([]);
  });
});
