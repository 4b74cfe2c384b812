import { AxeBuilder } from '@axe-core/playwright';
import type { Browser } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { holders } from '../../access/holders.js';
import { requireProgram } from '../../support/requirements.js';
import { ScriptedPlant } from '../http/scriptedPlant.js';
import { buildPage, openBrowser, openPage, type Served, serve } from './browser.js';

const chromium = requireProgram('chromium');

describe.skipIf(!chromium)('the log-in of the page, in a real browser', { timeout: 30_000 }, () => {
  const { access, tokens, list } = holders();
  const plant = new ScriptedPlant();
  let browser: Browser;
  let served: Served;
  beforeAll(async () => {
    const [opened, folder] = await Promise.all([openBrowser(chromium!), buildPage()]);
    browser = opened;
    served = await serve(plant, folder, { access });
  }, 60_000);
  afterAll(async () => {
    await browser?.close();
    await served?.server.stop();
  });

  it('is asked for, lets in, signs what is done, and ends with the token', async () => {
    const event = plant.raise({ kind: 'front_spread', subject: 'hot' });
    const { page, said, close } = await openPage(browser, served.url);
    await page.waitForSelector('#login');
    expect(await page.title()).toBe('Log in · rockhour');
    // Nothing of the plant is to be seen.
    expect(await page.locator('#freshness').count()).toBe(0);
    const { violations } = await new AxeBuilder({ page }).analyze();
    expect(violations.map(({ id }) => id)).toEqual([]);

    await page.keyboard.type('rockhour-wrong');
    await page.keyboard.press('Enter');
    await page.waitForSelector('#login-fault >> text=nobody is known by this token');
    await page.locator('#login-token').fill(tokens.acknowledge);
    await page.keyboard.press('Enter');
    await page.waitForSelector('#freshness[data-trust="live"] >> visible=true');
    expect(await page.locator('#who-am-i').textContent()).toContain(
      'Logged in as a_acknowledge, who may acknowledge',
    );
    // Without a name typed: the log-in is one.
    await page
      .getByRole('button', { name: /^Acknowledge/ })
      .first()
      .click();
    await expect.poll(() => plant.acknowledged).toEqual([{ id: event.id, who: 'a_acknowledge' }]);
    const script = await page.evaluate(() => document.cookie);
    expect(script).toBe('');

    // Kept over a visit; taken back, the page asks again by itself.
    await page.reload();
    await page.waitForSelector('#freshness[data-trust="live"] >> visible=true');
    access.replace(list.filter(({ role }) => role !== 'acknowledge'));
    await page.waitForSelector('#login');
    expect(await page.locator('#freshness').count()).toBe(0);

    await page.locator('#login-token').fill(tokens.view);
    await page.keyboard.press('Enter');
    await page.waitForSelector('#who-am-i');
    await page.locator('#who-am-i button').click();
    await page.waitForSelector('#login');
    expect(await page.context().cookies()).toEqual([]);
    // A browser itself notes each 401; the page says nothing.
    expect(said.filter((line) => !/status of (401|403)/.test(line))).toEqual([]);
    await close();
  });
});
