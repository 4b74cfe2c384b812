import { readFile } from 'node:fs/promises';
import type { Browser, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import { requireProgram } from '../../support/requirements.js';
import { waitFor } from '../../support/wait.js';
import { COLD, HOT, unitOf } from '../http/scriptedDefinitions.js';
import { ScriptedPlant } from '../http/scriptedPlant.js';
import { scriptedReport } from '../http/scriptedTrade.js';
import { buildPage, field, openBrowser, openPage, type Served, serve } from './browser.js';

const chromium = requireProgram('chromium');

describe.skipIf(!chromium)('the sheet of who sells', { timeout: 30_000 }, () => {
  let browser: Browser;
  let folder: string;
  let plant: ScriptedPlant;
  let served: Served;
  const opened: Awaited<ReturnType<typeof openPage>>[] = [];

  beforeAll(async () => {
    [browser, folder] = await Promise.all([openBrowser(chromium!), buildPage()]);
  }, 60_000);
  afterAll(() => browser?.close());

  beforeEach(async () => {
    plant = new ScriptedPlant([unitOf('north', 'North unit', [HOT, COLD])]);
    plant.marches = true;
    plant.moment = { charged: 0.9, mode: 'stand' };
    served = await serve(plant, folder);
  });
  afterEach(async () => {
    for (const page of opened.splice(0)) await page.close();
    await served.server.stop();
  });

  async function open(part: string, options: Parameters<typeof openPage>[2] = {}): Promise<Page> {
    const one = await openPage(browser, `${served.url}#offer/${part}`, options);
    opened.push(one);
    await one.page.waitForSelector('.offer-sheet h1');
    return one.page;
  }

  const text = (page: Page, name: string, within?: string) =>
    field(page, name, within).first().textContent();
  const offersAsked = () => plant.planAsked.filter(({ kind }) => kind === 'offers').length;

  it('asks for one table by itself, and shows energy and hours as the service gives them', async () => {
    const page = await open('table');
    await page.waitForSelector('.matrix');
    expect(offersAsked()).toBe(1);
    expect(plant.kept).toHaveLength(0);
    expect(await page.locator('.matrix thead th').allTextContents()).toEqual([
      ...['from', '06:00', '08:00', '10:00', '12:00'],
    ]);
    // The script ends evenly between 90 and 110 % of 14.4 MWh: p90 is 92 % of it.
    const rated = '[data-power="2"] td:nth-of-type(1)';
    expect(Number(await text(page, 'energy', rated))).toBeCloseTo(0.92 * 14.4, 1);
    expect(await text(page, 'hours', rated)).toMatch(/^6 h 3[78] min$/);
    expect(await page.locator('.matrix caption').textContent()).toContain('firm (nine in ten)');
    const now = Number(await text(page, 'energy', rated));
    const later = Number(await text(page, 'energy', '[data-power="2"] td:nth-of-type(4)'));
    expect(later).toBeLessThan(now);
    // Another certainty of the same answer costs no question.
    await page.locator('input[name="certainty-now"][value="0.5"]').check({ force: true });
    await waitFor('the even figure', async () => Number(await text(page, 'energy', rated)) > now);
    expect(offersAsked()).toBe(1);
  });

  it('draws the chosen offer as an area that is its energy', async () => {
    const page = await open('table');
    await page.locator('[data-power="1"] td:nth-of-type(2) button').click();
    await page.waitForSelector('[data-power="1"] button[aria-pressed="true"]');
    const area = await page.evaluate(() => {
      const svg = document.querySelector('[data-field="chosen-area"]')!.closest('svg')!;
      const box = (svg.querySelector('[data-field="chosen-area"]') as SVGRectElement).getBBox();
      const marks = [...svg.querySelectorAll('.axes .mark')];
      const rules = [...svg.querySelectorAll('.axes .rule')];
      const names = [...svg.querySelectorAll('.axes text')].map((one) => Number(one.textContent));
      const at = (one: Element, name: string) => Number(one.getAttribute(name));
      const perMW = (at(rules[0]!, 'y1') - at(rules[1]!, 'y1')) / (names[1]! - names[0]!);
      const labels = names.slice(rules.length);
      const perHour = (at(marks[1]!, 'x1') - at(marks[0]!, 'x1')) / (labels[1]! - labels[0]!);
      return (box.width / perHour) * (box.height / perMW);
    });
    const energy = Number(await text(page, 'energy', '[data-power="1"] td:nth-of-type(2)'));
    expect(area).toBeCloseTo(energy, 1);
    expect(await text(page, 'chosen-energy')).toBe(energy.toFixed(2));
    expect(await text(page, 'ends')).toBe('hot outlet too cool');
  });

  it('says what is wrong with the form, asks what it says, and keeps only where it is told to', async () => {
    const page = await open('table');
    await page.waitForSelector('.matrix');
    await page.fill('[name="powers"]', '2 lots');
    await page.click('button.main');
    expect(await page.locator('#table-fault').textContent()).toMatch(/“lots” is no power/);
    expect(offersAsked()).toBe(1);
    await page.fill('[name="powers"]', '1,5; 4');
    await page.fill('[name="count"]', '2');
    await page.getByText('Prices, to find').click();
    await page.fill('[name="shortfall"]', '150');
    await page.fill('[name="surplus"]', '50');
    await page.getByText('Keep it as a promise').click();
    await page.click('button.main');
    await page.waitForSelector('.kept');
    expect(plant.kept).toHaveLength(1);
    const asked = plant.planAsked.findLast(({ kind }) => kind === 'offers')!;
    expect(asked.ask).toMatchObject({ powers_W: [4e6, 1.5e6], gate: { count: 2 }, block_s: 3600 });
    expect(await page.locator('[data-power="4"] .refused').first().textContent()).toContain(
      'above its greatest power',
    );
    await page.locator('[data-power="1.5"] button').first().click();
    expect(await text(page, 'bid')).toContain('certain to 75 %');
  });

  it('marks an answer that the unit has moved on from, and asks again when told', async () => {
    const page = await open('table');
    await page.waitForSelector('.matrix');
    expect(await page.locator('.moved').count()).toBe(0);
    plant.moment = { charged: 0.9, mode: 'discharge' };
    plant.step();
    await page.waitForSelector('.moved');
    expect(await page.locator('.moved').textContent()).toContain(
      'it was standing, now it is discharging',
    );
    expect(offersAsked()).toBe(1);
    await page.getByRole('button', { name: 'Ask again' }).click();
    await page.waitForSelector('.moved', { state: 'detached' });
    expect(offersAsked()).toBe(2);
  });

  it('says that it waits, and gives up when told', async () => {
    plant.planTakes_ms = 60_000;
    const page = await open('table');
    await page.waitForSelector('.awaited >> visible=true');
    expect(await page.locator('.awaited').textContent()).toContain('Being worked out');
    plant.planTakes_ms = 0;
    await page.getByRole('button', { name: 'Cancel' }).click();
    await page.waitForSelector('.awaited >> visible=false', { state: 'attached' });
    expect(await page.locator('.matrix').count()).toBe(0);
    await page.click('button.main');
    await page.waitForSelector('.matrix');
  });

  it('names the lines of a schedule that are wrong, and asks nothing then', async () => {
    const page = await open('schedule');
    await page.fill('textarea', '18:00, 20:00, 1,8\n20:00, 21:00, sell');
    await page.click('button.main');
    expect(await page.locator('.line-faults li').allTextContents()).toEqual([
      '▲ Line 2: “sell” is no power in MW; such as 1.8 or 1,8',
    ]);
    expect(await page.locator('.preview tbody tr').count()).toBe(1);
    expect(plant.planAsked).toHaveLength(0);
    // What is past is told at its line, by the clocks of the connection, and not asked about.
    await page.fill('textarea', '18:00 19:00 1\n2026-01-31T05:00Z, 2026-01-31T05:30Z, 1');
    await page.click('button.main');
    expect(await page.locator('.line-faults li').allTextContents()).toEqual([
      '▲ Line 2: it begins at 2026-01-31 05:00, which is past',
    ]);
    expect(await page.locator('.preview caption').textContent()).toMatch(
      /times of UTC, those typed with an offset or Z too$/,
    );
    expect(plant.planAsked).toHaveLength(0);
    expect(opened[0]!.said).toEqual([]);
  });

  it('tells at its line what only the server knows, until the rows are others; a reload keeps them', async () => {
    const page = await open('schedule');
    const rows = '18:00, 20:00, 1\n2026-01-31T19:00Z, 2026-01-31T21:00Z, 1';
    await page.fill('textarea', rows);
    await page.click('button.main');
    await page.waitForSelector('.line-faults li');
    expect(await page.locator('.line-faults li').first().textContent()).toMatch(
      /^▲ Line 2: from is .* expected .*blocks may not overlap/,
    );
    expect(await page.locator('.fault').allTextContents()).toContain(
      'The schedule was refused; see its rows.',
    );
    await page.fill('textarea', '18:00, 20:00, 1');
    await page.waitForSelector('.line-faults li', { state: 'detached' });
    expect((await page.locator('.fault').allTextContents()).join('')).toBe('');
    await page.reload();
    await page.waitForSelector('.preview tbody tr');
    expect(await page.inputValue('textarea')).toBe('18:00, 20:00, 1');
  });

  it('checks a schedule, draws where it is short, and takes over the nearest that holds', async () => {
    const page = await open('schedule');
    await page.fill('textarea', '18:00, 20:00, 1,8\n20:00, 23:00, 2\n23:00, 02:30, 2');
    await page.click('button.main');
    await page.waitForSelector('.verdict');
    expect(await text(page, 'verdict')).toBe('▲ Does not hold');
    // 14.4 MWh less 1.28 sigma of 4 % is 13.66; 9.6 are gone by 23:00, so it lasts 2 h 2 min more.
    expect(await page.locator('.picture .short text').textContent()).toBe('▲ short from 01:02');
    expect(await page.locator('.picture .energy').count()).toBe(3);
    expect(await page.locator('.picture .missing').count()).toBe(1);
    expect(await text(page, 'first-short')).toContain('cold outlet too warm');
    await page.click('[data-action="use-nearest"]');
    await waitFor('a schedule that holds', async () => (await text(page, 'verdict')) === '● Holds');
    expect(await page.inputValue('textarea')).toMatch(
      /^from,to,mode,power_MW_el\n2026-01-31 18:00,2026-01-31 20:00,discharge,1\.\d+\n/,
    );
    expect(await page.locator('.picture .missing').count()).toBe(0);
    expect(plant.planAsked).toHaveLength(2);
    await page.fill('textarea', '18:00, 20:00, 1');
    await page.waitForSelector('.moved');
    const download = page.waitForEvent('download');
    await page.getByRole('button', { name: 'Save as CSV' }).click();
    const saved = await readFile(await (await download).path(), 'utf8');
    expect(saved.split('\r\n')).toHaveLength(4);
    expect(saved).toContain('2026-01-31T18:00:00Z,2026-01-31T20:00:00Z,discharge,');
  });

  it('writes the whole blocks of an offer as a schedule', async () => {
    const page = await open('table');
    await page.getByRole('button', { name: 'Check its blocks as a schedule' }).click();
    await page.waitForSelector('textarea');
    expect(await page.inputValue('textarea')).toBe(
      'from,to,mode,power_MW_el\n2026-01-31 06:00,2026-01-31 12:00,discharge,2',
    );
  });

  it('holds promises against delivery, and opens a kept table as it was answered', async () => {
    plant.report = scriptedReport(Date.parse(plant.time()));
    const page = await open('table');
    await page.waitForSelector('.matrix');
    await page.getByText('Keep it as a promise').click();
    await page.click('button.main');
    await page.waitForSelector('.kept');
    await page.locator('.kept a').click();
    await page.waitForSelector('.promise-view');
    expect(await text(page, 'firm-kept')).toBe('16 of 18');
    expect(await text(page, 'firm-words')).toBe(
      '2 of 18 short; meant 1.8: in keeping with what was said',
    );
    expect(await page.locator('.picture .given').count()).toBe(18);
    expect(await page.locator('.picture .given.short').count()).toBe(2);
    await page.getByRole('link', { name: 'Open kept table 1', exact: true }).last().click();
    await page.waitForSelector('.matrix');
    expect(await page.locator('.moved').textContent()).toContain('not what holds now');
    expect(new URL(page.url()).hash).toBe('#offer/promises/1');
  });

  it('tells what can still be charged, and both ways against state of charge', async () => {
    const page = await open('charge');
    await page.waitForSelector('.charge-view');
    expect(await text(page, 'headroom', '[data-charge="3"]')).toBe((0.9 * 16 * 0.96).toFixed(2));
    expect(plant.planAsked.map(({ kind }) => kind)).toEqual(['headroom']);
    await page.click('[data-action="capability"]');
    await page.waitForSelector('.capability svg');
    expect(await text(page, 'capability-now')).toBe(
      'Now, at 90 %: gives up to 3.00 MW electric, takes up to 3.00 MW electric.',
    );
  });

  it.each([
    ['table', 390],
    ['schedule', 320],
    ['promises', 320],
    ['charge', 320],
  ])(
    'fits %s into %i px without a sideways scroll, and says nothing to the console',
    async (part, width) => {
      plant.report = scriptedReport(Date.parse(plant.time()));
      const page = await open(part, { width, height: 700 });
      if (part === 'schedule') {
        await page.fill('textarea', '18:00 23:00 3\n23:00 02:00 2');
        await page.click('button.main');
      }
      await page.waitForSelector('.picture svg');
      const wide = await page.evaluate(() => document.documentElement.scrollWidth);
      expect(wide).toBeLessThanOrEqual(width);
      expect(opened[0]!.said).toEqual([]);
      expect(opened[0]!.foreign).toEqual([]);
    },
  );
});
