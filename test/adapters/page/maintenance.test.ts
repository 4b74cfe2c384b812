import { AxeBuilder } from '@axe-core/playwright';
import type { Browser, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, describe, expect, it } from 'vitest';
import { requireProgram } from '../../support/requirements.js';
import type { ScriptedPlant } from '../http/scriptedPlant.js';
import { agedPlant, DECIDED_H, DUST_H, GAP_H } from './agedPlant.js';
import { buildPage, field, openBrowser, openPage, type Served, serve } from './browser.js';

const chromium = requireProgram('chromium');
const PARTS = ['indicators', 'cycles', 'playback', 'strings', 'thermocouples', 'report'];
const words = (time: string) => time.replace('T', ' ').slice(0, 19);

describe.skipIf(!chromium)('the rock sheet, in a real browser', { timeout: 60_000 }, () => {
  let browser: Browser;
  let folder: string;
  let plant: ScriptedPlant;
  let served: Served;
  const opened: { close(): Promise<void> }[] = [];

  beforeAll(async () => {
    [browser, folder] = await Promise.all([openBrowser(chromium!), buildPage()]);
  }, 60_000);
  afterAll(() => browser?.close());
  afterEach(async () => {
    for (const one of opened.splice(0)) await one.close();
    await served?.server.stop();
  });

  async function open(part = '', options: Parameters<typeof openPage>[2] & { ill?: boolean } = {}) {
    plant = agedPlant(options.ill ?? true);
    served = await serve(plant, folder);
    const one = await openPage(
      browser,
      `${served.url}#rock${part === '' ? '' : `/${part}`}`,
      options,
    );
    opened.push(one);
    await one.page.waitForSelector('.rock-counts');
    return one;
  }
  const hoursAgo = (hours: number) => plant.time(-hours * 120);
  const slider = (page: Page) => page.locator('.rock-player input[type=range]');

  it('says first what has changed, where, since when and how sure', async () => {
    const { page } = await open();
    expect(await page.locator('h1').textContent()).toBe('Changed since healthy: store hot');
    const change = page.locator('.rock-changes li');
    await page.waitForSelector('.rock-changes a');
    expect(await change.count()).toBe(1);
    expect(await change.textContent()).toContain(
      'Heat-transfer factor, store hot: 0.31 ± 0.03 where 0.93 is healthy and 0.65 the limit',
    );
    // The test's sum left zero with the first dust, the state changed at the decision.
    expect(await change.textContent()).toContain(
      `Began after ${words(hoursAgo(DUST_H))}, sure since ${words(hoursAgo(DECIDED_H))}; 21 sigmas from healthy`,
    );
    expect(await page.locator('.rock-counts > [data-standing]').allTextContents()).toEqual([
      ' 1 changed',
      ' 1 not decided',
      ' 8 as when healthy',
      ' 3 not known',
    ]);
    const causes = await page.locator('.rock-causes h3').allTextContents();
    expect(causes).toEqual([
      'dust or fines in the bed, store hot',
      'gas that finds a channel through the bed, store hot',
    ]);
    expect(await page.locator('[data-cause="dust_or_fines"]').textContent()).toContain(
      'Check filters and screens of the gas loop.',
    );
  });

  it('draws each indicator on one ruler, and tells the sentence on asking', async () => {
    const { page } = await open();
    const row = page.locator('[data-kind="heat_transfer"][data-subject="hot"]');
    const x = (selector: string) =>
      row.locator(selector).evaluate((one) => {
        const box = (one as SVGGraphicsElement).getBBox();
        return box.x + box.width / 2;
      });
    // 0.31 is 2.2 times as far from healthy as the limit: beyond the ruler, an arrow at its end.
    expect(await x('.mark')).toBeGreaterThan(await x('.limit'));
    const healthy = page.locator('[data-kind="heat_transfer"][data-subject="cold"]');
    const at = await healthy.locator('.mark').getAttribute('cx');
    expect(Number(at)).toBe(44);
    expect(await row.locator('p').first().isVisible()).toBe(false);
    await row.locator('summary').focus();
    await page.keyboard.press('Enter');
    expect(await row.locator('p').first().isVisible()).toBe(true);
    expect(await row.locator('p').first().textContent()).toContain('in a whole sentence');
    const loss = page.locator('[data-kind="standing_loss"]');
    expect(await loss.textContent()).toContain('the plant has not yet done what shows it');
    expect(await loss.locator('.mark').count()).toBe(0);
  });

  it('has no colour where nothing has changed, and sees a change with the alarm that tells of it', async () => {
    const { page } = await open('', { ill: false });
    expect(await page.locator('h1').textContent()).toBe('Nothing has changed since healthy');
    expect(await page.locator('main [data-standing="changed"]').count()).toBe(0);
    plant.watched = agedPlant().watched;
    plant.raise({ kind: 'heat_transfer_low', subject: 'hot' });
    await page.waitForSelector('.rock-changes li');
    await expect
      .poll(() => page.locator('.rock-changes small').textContent())
      .toContain(`ure since ${words(plant.time())}`);
  });

  it('charts widths, spread, heat transfer and flow, each with its limit, store by store', async () => {
    const { page } = await open('cycles');
    await page.waitForSelector('.rock-chart canvas');
    await expect.poll(() => page.locator('.rock-chart canvas').count()).toBe(8);
    const told = (id: string) => page.locator(`[data-chart-of="${id}"] .when`).textContent();
    expect(await told('hot width')).toBe('Newest: charging 1.30, discharging 1.10');
    expect(await told('hot heat_transfer')).toBe('Newest: value 0.31, healthy 0.93, limit 0.65');
    expect(await told('hot string_flow')).toBe(
      'Newest: A 1.000, B 1.010, C 1.020, healthy 1.000, limit 1.060, limit 0.940',
    );
    await page.locator('input[name=place][value="0.25"]').check({ force: true });
    await expect.poll(() => told('hot width')).toBe('Newest: charging 1.05, discharging 0.85');
    const asked = page.waitForRequest((one) => one.url().includes('watch/history'));
    await page.locator('input[name=span][value="90"]').check({ force: true });
    const { searchParams } = new URL((await asked).url());
    const span_ms = Date.parse(searchParams.get('to')!) - Date.parse(searchParams.get('from')!);
    expect(span_ms).toBe(90 * 86_400_000);
  });

  it('plays back the beds: by keyboard, by steps, by itself, never as if it were now', async () => {
    const { page } = await open('playback');
    await page.waitForSelector('.rock-past .estimate', { state: 'attached' });
    const heading = () => page.locator('.rock-past h2').textContent();
    const front = () => field(page, 'past-front', '.rock-past [data-store="hot"]').textContent();
    expect(await page.locator('.rock-player [aria-pressed]').getAttribute('aria-pressed')).toBe(
      'false',
    );
    await slider(page).focus();
    await page.keyboard.press('Home');
    await expect
      .poll(heading)
      .toBe(`Past As it was at ${words(hoursAgo(24))}, 24 h 00 min before the newest estimate`);
    // The script: a state of charge of 0.15 at the begin of the day's charge, 8 m of rock.
    await expect.poll(front).toContain('front 1.20 ± 0.03 m');
    expect(await page.locator('.rock-past h3').first().textContent()).toContain('as it was at');
    // Faster than the page draws, which is once a frame: none is lost.
    await slider(page).evaluate((one) => {
      const key = { key: 'ArrowRight', bubbles: true, cancelable: true };
      for (let i = 0; i < 6; i++) one.dispatchEvent(new KeyboardEvent('keydown', key));
    });
    await expect.poll(heading).toContain(words(hoursAgo(23)));
    await expect.poll(front).toContain('front 2.00 ± 0.03 m');
    await page.getByLabel('One stored moment back').click();
    await expect.poll(heading).toContain(words(hoursAgo(23 + 1 / 6)));
    // At rest the address says which moment it is, and the band of its sigmas is there.
    await expect.poll(() => page.url()).toContain(`#rock/playback/${hoursAgo(23 + 1 / 6)}`);
    await page.reload();
    await expect.poll(heading).toContain(words(hoursAgo(23 + 1 / 6)));
    await page.locator('.rock-player .play').click();
    // It plays on while it is looked at: what counts is that it has come so far by itself.
    const shown = async () =>
      /As it was at ([-\d]+ [:\d]+)/.exec((await heading()) ?? '')?.[1] ?? '';
    await expect.poll(async () => (await shown()) >= words(hoursAgo(22.5))).toBe(true);
    const play = page.locator('.rock-player .play');
    await play.click();
    await expect.poll(() => play.getAttribute('aria-pressed')).toBe('false');
    // The last step may still be on its way to the heading; of a player at work two would come.
    const still = async () => {
      const before = await heading();
      await page.waitForTimeout(500);
      return (await heading()) === before;
    };
    await expect.poll(still).toBe(true);
  });

  it('keeps the moment that is played back over a restart of the daemon', async () => {
    const { page } = await open('playback');
    const port = Number(new URL(served.url).port);
    await slider(page).focus();
    const stands = (moment: string) =>
      page.waitForSelector(`.rock-past h2:has-text("2026-01-30 ${moment}")`);
    await page.keyboard.press('Home');
    await stands('06:00:00');
    await page.keyboard.press('ArrowRight');
    await stands('06:10:00');
    await page.waitForURL(/#rock\/playback\/20/);
    const shown = await page.locator('.rock-past h2').textContent();
    await page.locator('.rock-player').evaluate((one) => one.setAttribute('data-same', ''));
    await served.server.stop();
    await page.waitForSelector('#freshness[data-trust="lost"]');
    const asked = page.waitForResponse((one) =>
      /api\/units\/[^/]+$/.test(new URL(one.url()).pathname),
    );
    served = await serve(plant, folder, { port });
    await page.waitForSelector('#freshness[data-trust="live"]', { timeout: 15_000 });
    await asked;
    expect(await page.locator('.rock-past h2').textContent()).toBe(shown);
    expect(await page.locator('.rock-player[data-same]').count()).toBe(1);
  });

  it('keeps the row of parts in sight of who changes the part from further down', async () => {
    const { page } = await open('indicators');
    await page.waitForSelector('.rock-row');
    await page.evaluate(() => scrollTo(0, document.documentElement.scrollHeight));
    await page.evaluate(() => {
      location.hash = '#rock/thermocouples';
    });
    await page.waitForSelector('[data-sensor]');
    const box = async (selector: string) => (await page.locator(selector).boundingBox())!;
    const head = await box('.top');
    expect((await box('.rock-parts')).y).toBeGreaterThanOrEqual(head.y + head.height);
  });

  it('leaves a gap a gap: nothing is drawn where nothing was stored', async () => {
    const { page } = await open('playback/2026-01-30T02:00:00Z');
    expect(hoursAgo(28)).toBe('2026-01-30T02:00:00.000Z');
    await page.waitForSelector('.rock-map .gap');
    expect(await page.locator('.rock-past h2').textContent()).toBe(
      'Nothing was stored at this time',
    );
    expect(await page.locator('.rock-past .estimate').count()).toBe(0);
    expect(await slider(page).getAttribute('aria-valuetext')).toContain('nothing stored');
    await page.getByLabel('One stored moment on').click();
    // The first moment after the gap.
    await expect
      .poll(() => page.locator('.rock-past h2').textContent())
      .toContain(words(hoursAgo(GAP_H.to - 1 / 6)));
    await page.fill('#playback-date', '2026-01-30T18:00');
    await page.keyboard.press('Enter');
    await expect
      .poll(() => page.locator('.rock-past h2').textContent())
      .toContain('2026-01-30 18:00:00');
    // Sent off within the frame in which it was written.
    await page.locator('#playback-date').evaluate((one: HTMLInputElement) => {
      one.value = '2026-01-30T17:00';
      one.dispatchEvent(new Event('input', { bubbles: true }));
      one.form!.requestSubmit();
    });
    await expect
      .poll(() => page.locator('.rock-past h2').textContent())
      .toContain('2026-01-30 17:00:00');
  });

  it('sets the strings beside each other, the front view against the bed model', async () => {
    const { page } = await open('strings');
    const hot = '[aria-label="Strings of store hot"]';
    await page.waitForSelector(`${hot} .profile-line`);
    expect(await page.locator(`${hot} tr[data-string="A"] td`).allTextContents()).toEqual([
      '0.6',
      '1.06 ±\u00a00.01',
      '5.14',
      '0.55',
      '5.00 ±\u00a00.05',
      '0.7\u00a0σ',
    ]);
    const front = (id: string) =>
      page.locator(`${hot} g[data-string="${id}"] .front`).getAttribute('cx').then(Number);
    const [a, b, c] = [await front('A'), await front('B'), await front('C')];
    // Leads of 0.18, 0 and -0.12 m on one scale.
    expect((a! - b!) / (b! - c!)).toBeCloseTo(0.18 / 0.12, 3);
    plant.moment = { charged: 0.3, mode: 'discharge' };
    plant.step();
    await expect
      .poll(() => page.locator(`${hot} tr[data-string="B"] td`).nth(2).textContent())
      .toBe('2.37');
  });

  it('lists thermocouples with verdict and evidence, filtered, sorted, and weighed on asking', async () => {
    const { page } = await open('thermocouples');
    await page.waitForSelector('tr[data-sensor="hot.B.10"]');
    const ids = () =>
      page
        .locator('tr[data-sensor]')
        .evaluateAll((all) => all.map((one) => one.getAttribute('data-sensor')));
    expect(await ids()).toHaveLength(84);
    const stuck = page.locator('tr[data-sensor="hot.B.10"]');
    expect(await stuck.textContent()).toContain('× stuck since 2026-01-31 06:00:00 by the script');
    await page.locator('input[name="sensor-filter"][value="rejected"]').check({ force: true });
    await expect
      .poll(async () => (await ids()).sort())
      .toEqual(['cold.B.10', 'cold.C.04', 'hot.B.10', 'hot.C.04']);
    // 0.7 of the span is read where the front has passed, or not come: the stuck ones are furthest.
    const apart = page.locator('th', { hasText: 'Apart' });
    await apart.locator('button').click();
    await expect.poll(() => apart.getAttribute('aria-sort')).toBe('descending');
    await expect
      .poll(async () => (await ids()).slice(0, 2).every((id) => id!.includes('.B.')))
      .toBe(true);
    await page.locator('input[name="sensor-filter"][value="store hot"]').check({ force: true });
    await expect.poll(async () => (await ids()).length).toBe(42);
    await page.getByRole('button', { name: 'What would losing each cost?' }).click();
    const worth = page.locator('th', { hasText: 'If lost' });
    await worth.locator('button').click();
    // The script: 1 % for each share of the length away from the middle.
    await expect
      .poll(() => page.locator('tr[data-sensor]').first().locator('td').nth(4).textContent())
      .toBe('0.5');
  });

  it('offers the report of a span, and refuses one that ends before it begins', async () => {
    const { page } = await open('report');
    const link = page.locator('.rock-open a');
    await expect.poll(() => link.getAttribute('href')).toContain('2026-01-31');
    const { pathname, searchParams } = new URL((await link.getAttribute('href'))!);
    expect(pathname).toBe('/api/units/north/report');
    expect(searchParams.get('to')).toBe(plant.time());
    const [tab] = await Promise.all([page.context().waitForEvent('page'), link.click()]);
    await tab.waitForLoadState();
    expect(await tab.locator('body').textContent()).toBe('report as html');
    await tab.close();
    await page.fill('#report-from', '2026-02-01T00:00');
    expect(await page.locator('.fault', { hasText: 'ends before' }).isVisible()).toBe(true);
    expect(await link.count()).toBe(0);
  });

  it.each([
    { width: 1280, dark: false, axe: ['indicators', 'playback'] },
    { width: 320, dark: true, axe: PARTS },
  ])(
    'holds at $width px, dark $dark: no axe finding, no message, no sideways scroll',
    async (size) => {
      const { page, said, foreign } = await open('', { ...size, height: 800 });
      for (const part of PARTS) {
        await page.evaluate((hash) => {
          location.hash = hash;
        }, `#rock/${part}`);
        await page.waitForSelector(`#${part}`);
        if (part === 'playback') await page.waitForSelector('.rock-player');
        if (part === 'cycles') await page.waitForSelector('.rock-chart canvas');
        expect(
          await page.evaluate(() => document.documentElement.scrollWidth - innerWidth),
          part,
        ).toBeLessThanOrEqual(0);
        if (!size.axe.includes(part)) continue;
        const { violations } = await new AxeBuilder({ page }).include('main').analyze();
        expect(violations.map(({ id, nodes }) => [part, id, nodes[0]?.html])).toEqual([]);
      }
      expect(said).toEqual([]);
      expect(foreign).toEqual([]);
    },
  );
});
