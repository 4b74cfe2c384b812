import type { Browser, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import { axeFinds } from '../../chain/pageChain.js';
import { requireProgram } from '../../support/requirements.js';
import { waitFor } from '../../support/wait.js';
import { COLD, HOT, unitOf } from '../http/scriptedDefinitions.js';
import { ScriptedPlant } from '../http/scriptedPlant.js';
import { buildPage, field, openBrowser, openPage, type Served, serve } from './browser.js';
import { freezingProxy } from './freezingProxy.js';

/** Questions about the time ahead are asked at most every two seconds. */
const SLOWLY = { timeout: 10_000 };
const chromium = requireProgram('chromium');

/** What axe-core finds: everything in light, and of contrast in dark. */
async function finds(page: Page): Promise<string[]> {
  const light = await axeFinds(page);
  await page.emulateMedia({ colorScheme: 'dark' });
  const dark = await axeFinds(page, ['color-contrast']);
  await page.emulateMedia({ colorScheme: 'light' });
  return [...light, ...dark.map((one) => `dark: ${one}`)];
}

describe.skipIf(!chromium)('the page, in a real browser', { timeout: 30_000 }, () => {
  let browser: Browser;
  let folder: string;
  let plant: ScriptedPlant;
  let served: Served;
  const opened: { close(): Promise<void> }[] = [];

  beforeAll(async () => {
    [browser, folder] = await Promise.all([openBrowser(chromium!), buildPage()]);
  }, 60_000);
  afterAll(() => browser?.close());

  beforeEach(async () => {
    plant = new ScriptedPlant([
      unitOf('north', 'North unit', [HOT, COLD]),
      unitOf('south', 'South unit', [HOT]),
    ]);
    served = await serve(plant, folder);
  });
  afterEach(async () => {
    for (const page of opened.splice(0)) await page.close();
    await served.server.stop();
  });

  async function open(options: Parameters<typeof openPage>[2] = {}, url = served.url) {
    const one = await openPage(browser, url, options);
    opened.push(one);
    await one.page.waitForSelector('#freshness[data-trust="live"] >> visible=true');
    return one;
  }

  it('shows the figures of the service, each with its unit', async () => {
    const { page } = await open();
    await page.waitForSelector('.estimate');
    const text = (name: string, within?: string) => field(page, name, within).textContent();
    expect(await text('soc')).toBe('62.0');
    expect(await text('mode')).toBe('discharging');
    expect(await text('power')).toBe('1.85');
    expect(await page.locator('[data-figure="power"] small').textContent()).toBe('delivered');
    expect(await text('flow')).toBe('12.4');
    expect(await page.locator('[data-figure="flow"] small').textContent()).toBe('discharging way');
    expect(await text('quality')).toBe('good');
    // The script: 0.62 of 16 MWh; p90 is 0.96 of it.
    expect(await text('dispatchable')).toBe((0.62 * 16 * 0.96).toFixed(2));
    expect(await page.locator('[data-figure="dispatchable"] .unit').textContent()).toBe(' MWhel');

    const hot = '[data-store="hot"]';
    expect(await text('store-soc', hot)).toBe('62.0 ± 0.4');
    expect(await text('stored', hot)).toBe(`${(0.62 * 42).toFixed(2)} ± 0.18`);
    expect(await text('spread', hot)).toBe('1.12');
    expect(await text('outlet', hot)).toBe('495.3');
    expect(await page.locator(`${hot} dd .unit`).allTextContents()).toEqual([
      ' %',
      ' MWhth',
      ' °C',
    ]);
    expect(await text('front', hot)).toBe(
      'front 4.96 ± 0.03 m, width 0.55 ± 0.04 m, moving up; positions from the charge inlet at the top',
    );
    expect(await text('front', '[data-store="cold"]')).toContain('front 4.03 ± 0.03 m');
    expect(await page.locator(`${hot} [data-string="A"] td`).allTextContents()).toEqual([
      '1.06 ± 0.01',
      '5.14 m',
      '0.55 m',
      '5.00 m, 0.7 σ',
    ]);
    expect(await text('sensors', hot)).toBe('Sensors: 40 used, 2 rejected');
    expect(await page.locator(`${hot} .rejected-list li`).first().textContent()).toContain(
      'hot.B.10 stuck since 2026-01-31 06:00:00',
    );
  });

  it('shows hours and energy at each configured power as the service gives them', async () => {
    const { page } = await open();
    await page.waitForSelector('#hours li');
    const answers = plant.now('north')!.dispatch!.answers;
    expect(await page.locator('.hours.configured li').count()).toBe(answers.length);
    for (const answer of answers) {
      const row = `[data-power="${answer.power_MW}"]`;
      for (const level of ['p90', 'p50', 'p10'] as const) {
        const minutes = Math.round(answer.hours[level] * 60);
        const words = `${Math.floor(minutes / 60)} h ${String(minutes % 60).padStart(2, '0')} min`;
        expect(await field(page, level, row).textContent()).toBe(words);
        expect(await field(page, `energy-${level}`, row).textContent()).toBe(
          answer.energy_MWh_el[level].toFixed(2),
        );
      }
      expect(await page.locator(`${row} .ends`).textContent()).toBe('ends: hot outlet too cool');
    }
    // The script works hours out two scans of 30 s before the newest, whose reading is 4 s old.
    expect(await page.locator('#hours > .when').textContent()).toMatch(
      /^from the estimate of 05:59:00, 1 min 0\d s old/,
    );
  });

  it('draws both beds to one scale, upright, with the front where it is', async () => {
    const { page } = await open();
    await page.waitForSelector('.front .line', { state: 'attached' });
    const drawn = await page.evaluate(() =>
      [...document.querySelectorAll<SVGSVGElement>('.bed')].map((svg) => {
        const box = (selector: string) => {
          const { x, y, width, height } = svg.querySelector<SVGPathElement>(selector)!.getBBox();
          return { x, y, width, height };
        };
        const wall = box('.wall');
        const ground = wall.y + wall.height + svg.getBoundingClientRect().top;
        return { wall, front: box('.front .line').y, width: box('.front .width').height, ground };
      }),
    );
    const [hot, cold] = drawn as [(typeof drawn)[0], (typeof drawn)[0]];
    const scale = hot.wall.height / HOT.bed.length_m;
    const half = 0.51; // the drawing is laid out in whole pixels
    expect(Math.abs(cold.wall.height - scale * COLD.bed.length_m)).toBeLessThan(half);
    expect(Math.abs(hot.wall.width - (scale * HOT.bed.diameter_m) / 2)).toBeLessThan(half);
    expect(Math.abs(cold.wall.width - (scale * COLD.bed.diameter_m) / 2)).toBeLessThan(half);
    expect(Math.abs(cold.ground - hot.ground)).toBeLessThan(half);
    // Hot: charge inlet at the top, x runs down. Cold: at the bottom, x runs up.
    expect(Math.abs(hot.front - (hot.wall.y + scale * 0.62 * 8))).toBeLessThan(half);
    const bottom = cold.wall.y + cold.wall.height;
    expect(Math.abs(cold.front - (bottom - scale * 0.62 * 6.5))).toBeLessThan(half);
    // The bracket spans 16 to 84 %: twice the width of 0.55 m.
    expect(Math.abs(hot.width - 2 * 0.55 * scale)).toBeLessThan(half);
  });

  it('marks rejected and missing sensors by shape, not by colour alone', async () => {
    const { page } = await open();
    await page.waitForSelector('.profile .used');
    const marks = (selector: string) =>
      page
        .locator(`[data-store="hot"] ${selector}`)
        .evaluateAll((all) => all.map((one) => one.tagName));
    expect(await marks('.profile .used')).toEqual(Array(40).fill('circle'));
    expect(await marks('.profile .rejected')).toEqual(['path']);
    expect(await marks('.strings .missing')).toEqual(['circle']);
    const dashes = await page
      .locator('[data-store="hot"] .strings .missing')
      .evaluate((one) => getComputedStyle(one).strokeDasharray);
    expect(dashes).not.toBe('none');
  });

  it('follows the plant without being reloaded, front, arrows and figures', async () => {
    const { page } = await open();
    await page.waitForSelector('.front .line', { state: 'attached' });
    plant.moment = { charged: 0.3, mode: 'charge' };
    plant.step();
    await expect.poll(() => field(page, 'soc').textContent()).toBe('30.4');
    await expect
      .poll(() => field(page, 'front', '[data-store="hot"]').textContent())
      .toMatch(/^front 2\.43 ± 0\.03 m.*moving down/);
    expect(await field(page, 'front', '[data-store="cold"]').textContent()).toContain('moving up');
    plant.moment = { charged: 0.3, mode: 'stand' };
    plant.step();
    await expect
      .poll(() => field(page, 'front', '[data-store="hot"]').textContent())
      .toContain('at rest');
    expect(await page.locator('.front .head').count()).toBe(0);
    expect(await field(page, 'outlet', '[data-store="hot"]').textContent()).toBe('–');
  });

  it('shows the string that is chosen, with the arrow keys too', async () => {
    const { page } = await open();
    await page.waitForSelector('.profile .used');
    const line = () => page.locator('[data-store="hot"] .estimate').getAttribute('points');
    const mean = await line();
    await page.locator('[data-store="hot"] input[value=""]').focus();
    await page.keyboard.press('ArrowRight');
    expect(await page.locator('[data-store="hot"] input[value="A"]').isChecked()).toBe(true);
    await expect.poll(line).not.toBe(mean);
    // The readings of the other two strings stand back.
    expect(await page.locator('[data-store="hot"] .profile .aside').count()).toBe(27);
  });

  it('says unmistakably that the data are stale, how old they are, and when they are well again', async () => {
    const { page } = await open();
    plant.stale = true;
    plant.age_s = 840;
    plant.step();
    await page.waitForSelector('#freshness[data-trust="stale"]');
    expect(await field(page, 'trust').textContent()).toBe('Stale');
    expect(await field(page, 'age').textContent()).toMatch(/^14 min 0\d s old$/);
    expect(await page.locator('#banner').textContent()).toBe(
      'The readings are stale. The figures below are those of 2026-01-31 06:00:30.',
    );
    expect(await page.locator('main').getAttribute('data-old')).toBe('');
    expect(await page.title()).toContain('Stale');
    plant.stale = false;
    plant.age_s = 1;
    plant.step();
    await page.waitForSelector('#freshness[data-trust="live"]');
    expect(await page.locator('#banner').isHidden()).toBe(true);
    expect(await page.locator('main').getAttribute('data-old')).toBeNull();
  });

  it('learns from the beat that a unit has gone stale though no state comes', async () => {
    const { page } = await open();
    plant.stale = true;
    plant.age_s = 301;
    await page.waitForSelector('#freshness[data-trust="stale"]');
  });

  it('says that the stream is lost, and comes back by itself with the events it missed', async () => {
    const { page } = await open();
    await page.waitForSelector('.estimate');
    const port = Number(new URL(served.url).port);
    await served.server.stop();
    await page.waitForSelector('#freshness[data-trust="lost"]');
    expect(await field(page, 'trust').textContent()).toBe('Not connected');
    expect(await page.locator('#banner').textContent()).toMatch(
      /^Connection lost since \d\d:\d\d:\d\d; trying again\. The figures below are those of 2026-01-31 06:00:00\.$/,
    );
    expect(await field(page, 'soc').textContent()).toBe('62.0');
    const age = async () =>
      Number(/(\d+) s old/.exec((await field(page, 'age').textContent())!)![1]);
    const before = await age();
    await expect.poll(age, { timeout: 4000 }).toBeGreaterThan(before);

    plant.raise({ kind: 'front_spread', subject: 'hot' });
    plant.step();
    served = await serve(plant, folder, { port });
    await page.waitForSelector('#freshness[data-trust="live"]', { timeout: 15_000 });
    await expect.poll(() => field(page, 'soc').textContent()).toBe('61.6');
    await page.waitForSelector('.events li');
    expect(await page.locator('#banner').isHidden()).toBe(true);
  });

  it('takes a connection that is open and silent for lost', async () => {
    const proxy = await freezingProxy(Number(new URL(served.url).port));
    const { page } = await open({}, proxy.url);
    await page.waitForSelector('.estimate');
    proxy.freeze();
    await page.waitForSelector('#freshness[data-trust="lost"]');
    proxy.thaw();
    await page.waitForSelector('#freshness[data-trust="live"]', { timeout: 15_000 });
    await proxy.close();
  });

  it('lists what stands, the urgent first, of every unit, and acknowledges with a name', async () => {
    const { page } = await open();
    plant.raise({ kind: 'front_spread', subject: 'hot' });
    plant.raise({
      kind: 'outlet_near_limit',
      subject: 'hot',
      unit: 'south',
      class: 'alarm',
      priority: 'high',
      message: 'outlet 12 K above its limit <b>now</b>',
    });
    await page.waitForSelector('.events li:nth-child(2)');
    const heads = await page.locator('.events .head').allTextContents();
    expect(heads).toEqual(['alarm, high · South unit · hot', 'alert, medium · North unit · hot']);
    expect(await page.locator('.events li p').nth(1).textContent()).toContain('<b>now</b>');
    expect(await page.locator('#open-count').textContent()).toBe(
      '▲ 1 alarm, 1 alert to acknowledge',
    );
    expect(await page.title()).toMatch(/^\(2\) /);

    const first = page.locator('.events li').first();
    await first.locator('[data-action="acknowledge"]').click();
    await page.waitForSelector('dialog[open]');
    await page.keyboard.press('Enter');
    await expect
      .poll(() => page.locator('dialog .fault').textContent(), SLOWLY)
      .toContain('a name is recorded');
    expect(await page.evaluate(() => document.activeElement?.id)).toBe('name-who');
    expect(plant.acknowledged).toEqual([]);

    await page.keyboard.type('night shift');
    await page.keyboard.press('Enter');
    await page.waitForSelector('dialog', { state: 'detached' });
    await page.waitForSelector('.events li[data-state="acknowledged"]');
    expect(plant.acknowledged).toEqual([{ id: 'south/outlet_near_limit/hot', who: 'night shift' }]);
    expect(await page.locator('.events li[data-state="acknowledged"]').textContent()).toContain(
      'acknowledged by night shift',
    );
    expect(await page.locator('#open-count').textContent()).toBe('■ 1 alert to acknowledge');
    await page.reload();
    await page.waitForSelector('.events li');
    expect(await page.locator('#who').inputValue()).toBe('night shift');
  });

  it('tells what is held back, by whom and why, apart from what stands', async () => {
    const { page } = await open();
    const { id } = plant.raise({ kind: 'valve_leaks', subject: 'cold' });
    await page.waitForSelector(`.events li[data-id="${id}"]`);
    const shelve = { id, action: 'shelve', who: 'day shift', hours: 2, why: 'seat being lapped' };
    expect(plant.commandAlarm(shelve).accepted).toBe(true);
    await page.waitForSelector('.held-back li', { state: 'attached' });
    expect(await page.locator(`.events li[data-id="${id}"]`).count()).toBe(0);
    expect(await page.locator('.held-back summary').textContent()).toBe('1 held back');
    expect(await page.locator('.held-back li p').first().textContent()).toMatch(
      /^valve leaks · North unit · cold: shelved by day shift until .*: seat being lapped$/,
    );
    plant.commandAlarm({ id, action: 'unshelve', who: 'day shift' });
    await page.waitForSelector(`.events li[data-id="${id}"]`);
    expect(await page.locator('.held-back').count()).toBe(0);
  });

  it('says in one line whether all is well, and what is not', async () => {
    const { page } = await open();
    const verdict = page.locator('#verdict');
    await page.waitForSelector('#verdict[data-level="known"]');
    expect(await field(page, 'verdict').textContent()).toBe(
      'As it should be, but 4 thermocouples are left out.',
    );
    expect(await verdict.locator('.because').textContent()).toBe(
      '80 of 84 thermocouples in use · estimate good · nothing stands',
    );
    plant.raise({ kind: 'valve_leaks', subject: 'cold' });
    await page.waitForSelector('#verdict[data-level="care"]');
    expect(await field(page, 'verdict').textContent()).toBe('Alert: valve leaks, cold');
    plant.stale = true;
    plant.step();
    await page.waitForSelector('#verdict[data-level="unknown"]');
  });

  it('shelves with name, reason and time, and takes back from the shelf, by the keyboard', async () => {
    const { page } = await open();
    plant.shelveMost_h = 6;
    const { id } = plant.raise({ kind: 'valve_leaks', subject: 'cold' });
    plant.raise({ kind: 'front_spread', subject: 'hot' });
    const shelve = page.locator(`.events li[data-id="${id}"] [data-action="shelve"]`);
    await shelve.focus();
    await page.keyboard.press('Enter');
    await page.waitForSelector('dialog[open]');
    await page.fill('#hide-who', 'day shift');
    await page.fill('#hide-hours', '9');
    await page.fill('#hide-why', 'seat being lapped');
    await page.keyboard.press('Enter');
    await expect
      .poll(() => page.locator('dialog .fault').textContent(), SLOWLY)
      .toContain('6 at most; "9" is not');
    await page.fill('#hide-hours', '2');
    await page.keyboard.press('Enter');
    await page.waitForSelector('dialog', { state: 'detached' });
    const [held] = plant.heldBack();
    expect(held!.shelved).toMatchObject({ by: 'day shift', why: 'seat being lapped' });
    expect(Date.parse(held!.shelved!.until) - Date.parse(plant.time())).toBe(2 * 3_600_000);
    await page.waitForSelector(`.events li[data-id="${id}"]`, { state: 'detached' });

    await page.locator('.held-back summary').click();
    await page.locator('.held-back [data-action="unshelve"]').click();
    await page.waitForSelector(`.events li[data-id="${id}"]`);
    expect(plant.heldBack()).toEqual([]);
  });

  it('keeps the keyboard on its item when the list changes under it', async () => {
    const { page } = await open();
    const { id } = plant.raise({ kind: 'valve_leaks', subject: 'cold' });
    const own = page.locator(`.events li[data-id="${id}"]`);
    await own.locator('[data-action="shelve"]').focus();
    plant.raise({ kind: 'outlet_near_limit', subject: 'hot', class: 'alarm', priority: 'high' });
    await page.waitForSelector('.events li:nth-child(2)');
    const focused = () =>
      page.evaluate(() => {
        const active = document.activeElement as HTMLElement;
        return [active.closest<HTMLElement>('[data-id]')?.dataset.id, active.dataset.action];
      });
    expect(await focused()).toEqual([id, 'shelve']);
    // Its button goes away with what it was for: the item keeps the focus.
    await page.fill('#who', 'night shift');
    await own.locator('[data-action="acknowledge"]').focus();
    await page.keyboard.press('Enter');
    await page.waitForSelector(`.events li[data-id="${id}"][data-state="acknowledged"]`);
    await expect.poll(async () => (await focused())[0], SLOWLY).toBe(id);
  });

  it('tells hours at the power delivered now, and what can still be taken', async () => {
    const { page } = await open();
    const row = page.locator('.asked-now [data-power="1.85"]');
    await row.waitFor();
    const p90 = ((0.62 * 16) / 1.85) * 0.96;
    const words = `${Math.floor(p90)} h ${String(Math.round((p90 % 1) * 60)).padStart(2, '0')} min`;
    expect(await row.locator('[data-field="p90"]').textContent()).toBe(words);
    expect(await field(page, 'firm-hours').textContent()).toBe(words);
    expect(await page.locator('[data-figure="firm-hours"] small').textContent()).toBe(
      'p90 at 1.85 MW electric, as now',
    );
    await expect
      .poll(() => field(page, 'headroom').textContent(), SLOWLY)
      .toBe((0.62 * 16 * 0.96).toFixed(2));
    // Standing delivers nothing: the firm figure is that at rated power.
    plant.moment = { charged: 0.62, mode: 'stand' };
    plant.step();
    await row.waitFor({ state: 'detached' });
    expect(await page.locator('[data-figure="firm-hours"] small').textContent()).toBe(
      'p90 at 2 MW electric',
    );
  });

  it('has all units at one look, and goes from there to one', async () => {
    const { page } = await open();
    plant.raise({ kind: 'outlet_near_limit', subject: 'hot', unit: 'south', class: 'alarm' });
    await page.locator('#sheets a', { hasText: 'All units' }).click();
    const south = page.locator('[data-unit-row="south"]');
    await page.waitForSelector('[data-unit-row="south"][data-level="urgent"]');
    const cell = (name: string) => south.locator(`[data-cell="${name}"]`).textContent();
    expect(await cell('mode')).toBe('discharging');
    expect(await cell('soc')).toBe('62 %');
    expect(await cell('hours')).toBe('4 h 46 minat 2 MWel');
    expect(await cell('energy')).toBe('9.52 MWhel');
    expect(await cell('power')).toBe('1.85 MWeldelivered');
    expect(await cell('well')).toBe('Alarm: outlet near limit, hot');
    expect(await cell('age')).toMatch(/^\d+ s old$/);
    expect(await page.locator('[data-unit-row="north"] [data-cell="well"]').textContent()).toBe(
      'As it should be, but 4 thermocouples are left out.',
    );
    expect(await field(page, 'verdict').textContent()).toBe('Alarm: 1 of 2 units.');
    await south.locator('a').click();
    await page.waitForSelector('main[data-sheet="now"] [data-store="hot"]');
    expect(await page.locator('[data-unit="south"]').getAttribute('aria-pressed')).toBe('true');
  });

  it('works out the hours at a power that the user types, again when the estimate moves on', async () => {
    const { page } = await open();
    await page.waitForSelector('#hours li');
    await page.fill('#power', '1,4');
    await page.keyboard.press('Enter');
    await page.waitForSelector('.asked li');
    const { answers } = await plant.hours('north', [1.4]);
    const p50 = '.asked [data-power="1.4"]';
    expect(await field(page, 'energy-p50', p50).textContent()).toBe(
      answers[0]!.energy_MWh_el.p50.toFixed(2),
    );
    plant.step();
    const after = (await plant.hours('north', [1.4])).answers[0]!.energy_MWh_el.p50.toFixed(2);
    await expect.poll(() => field(page, 'energy-p50', p50).textContent(), SLOWLY).toBe(after);
    expect(await field(page, 'asked-stale', '#hours').textContent()).toBe('');
    // A power that the machine does not have is answered with that word.
    await page.fill('#power', '3.5');
    await page.keyboard.press('Enter');
    const told = page.locator('.asked [data-power="3.5"] .ends');
    await told.waitFor();
    expect(await told.textContent()).toMatch(/^limited: above its greatest power · ends: /);
  });

  it('marks the hours at a typed power that stand on a stale estimate', async () => {
    const { page } = await open();
    await page.waitForSelector('#hours li');
    plant.stale = true;
    try {
      await page.fill('#power', '1.4');
      await page.keyboard.press('Enter');
      await page.waitForSelector('.asked li');
      expect(await field(page, 'asked-stale', '#hours').textContent()).toMatch(/^Stale: /);
    } finally {
      plant.stale = false;
    }
  });

  it('says what is wrong with a power that is none, and asks nothing then', async () => {
    const { page } = await open();
    await page.waitForSelector('#hours li');
    for (const wrong of ['', 'two', '0', '-1', '1e3', '99999']) {
      await page.fill('#power', wrong);
      await page.keyboard.press('Enter');
      await expect
        .poll(() => page.locator('#power-fault').textContent(), SLOWLY)
        .toBe(`A power in MW is a number above 0 and below 10000, as in 1.8; "${wrong}" is not.`);
    }
    expect(await page.locator('#power').getAttribute('aria-invalid')).toBe('true');
    expect(await page.locator('.asked li').count()).toBe(0);
  });

  it('changes the unit, keeps it over a reload, and closes the former stream', async () => {
    const { page } = await open();
    await page.waitForSelector('[data-store="cold"]');
    await page.click('[data-unit="south"]');
    await page.waitForSelector('[data-store="cold"]', { state: 'detached' });
    await page.waitForSelector('[data-store="hot"] .estimate');
    expect(await page.locator('[data-unit="south"]').getAttribute('aria-pressed')).toBe('true');
    await page.reload();
    await page.waitForSelector('[data-store="hot"] .estimate');
    expect(await page.locator('.store').count()).toBe(1);
  });

  it('shows dashes and says so before the first scan', async () => {
    plant.started = false;
    const one = await openPage(browser, served.url);
    opened.push(one);
    await one.page.waitForSelector('#freshness[data-trust="empty"]');
    expect(await one.page.locator('#banner').textContent()).toContain('no scan has been taken in');
    for (const name of ['soc', 'power', 'flow', 'mode', 'dispatchable']) {
      expect(await field(one.page, name).textContent()).toBe('–');
    }
    plant.started = true;
    plant.step();
    await one.page.waitForSelector('#freshness[data-trust="live"]');
    await one.page.waitForSelector('.estimate');
  });

  it('draws the history of charge and hours', async () => {
    const { page } = await open();
    await page.waitForSelector('[data-chart="charge"] canvas');
    await page.waitForSelector('[data-chart="hours"] canvas');
    await page.locator('input[value="6"]').check();
    await page.waitForSelector('[data-chart="hours"] canvas');
    await page.locator('[data-chart="charge"] .u-over').hover({ position: { x: 150, y: 20 } });
    await expect
      .poll(() => field(page, 'cursor').textContent())
      .toMatch(/^2026-01-31 0\d:\d\d:\d\d · \d+\.\d % charged( · p50 (\d h )?\d+ min)?$/);
  });

  it('keeps the answer to a long alert in sight at 1280 x 800, and says what was seen once', async () => {
    const message =
      'Store hot: a sentence that goes on for long about what its thermocouples have in common, ' +
      'so long that it takes several rows of a narrow list, as such sentences do. What it means ' +
      'and where to look takes as much room again, and stands with what to do.';
    plant.raise({ kind: 'valve_leaks', subject: 'hot', message });
    plant.raise({ kind: 'bed_settled', subject: 'hot', message });
    const { page } = await open();
    await page.waitForSelector('.events li:nth-child(2)');
    const button = page.locator('.events [data-action="acknowledge"]').first();
    const { y, height } = (await button.boundingBox())!;
    const list = (await page.locator('.events').boundingBox())!;
    expect(y + height).toBeLessThanOrEqual(Math.min(800, list.y + list.height));
    expect(await page.locator('#verdict').textContent()).not.toContain('a sentence that goes on');
    // Without a name it is asked for in view, over the sheet.
    await button.click();
    await page.waitForSelector('#name-who');
    const field = (await page.locator('#name-who').boundingBox())!;
    expect(field.y + field.height).toBeLessThan(800);
  });

  it('says that the address asks for a unit that is not here, until another is chosen', async () => {
    const { page } = await open({}, `${served.url}?unit=nobody`);
    const told = page.locator('#not-here');
    expect(await told.textContent()).toBe('There is no unit “nobody” here. This is North unit.');
    await page.click('[data-unit="south"]');
    await told.waitFor({ state: 'detached' });
  });

  it('says how many stand below the seen part of the list, and goes there', async () => {
    const { page } = await open();
    for (const kind of [
      'valve_leaks',
      'front_spread',
      'gas_lost',
      'stores_mismatched',
      'bed_settled',
    ])
      plant.raise({ kind, subject: 'hot' } as Parameters<typeof plant.raise>[0]);
    await page.waitForSelector('.events li:nth-child(5)');
    const below = page.locator('.events-below');
    await expect.poll(() => below.textContent(), SLOWLY).toMatch(/^▼ [34] more below$/);
    // Each press goes on by a part of the list; the word goes with the last of it.
    await expect
      .poll(async () => {
        await page.evaluate(() => document.querySelector<HTMLElement>('.events-below')?.click());
        return below.count();
      }, SLOWLY)
      .toBe(0);
    const seen = await page.locator('.events').evaluate((list) => {
      const last = list.lastElementChild!.getBoundingClientRect();
      return last.bottom - list.getBoundingClientRect().bottom;
    });
    expect(seen).toBeLessThan(7);
  });

  it('keeps the age in the first row of the head, and alone in view on a phone', async () => {
    const { page } = await open();
    plant.raise({ kind: 'outlet_near_limit', subject: 'hot', class: 'alarm', priority: 'high' });
    await page.waitForSelector('#open-count');
    const box = async (selector: string) => (await page.locator(selector).boundingBox())!;
    expect((await box('.top')).height).toBeLessThan(60);
    expect(await page.locator('#units button').count()).toBe(2);
    plant.stale = true;
    plant.age_s = 840;
    plant.step();
    await page.waitForSelector('#freshness[data-trust="stale"]');
    await page.waitForSelector('#units select');
    expect((await box('.top')).height).toBeLessThan(60);
    await page.setViewportSize({ width: 390, height: 844 });
    await page.evaluate(() => window.scrollTo(0, 900));
    await expect.poll(async () => (await box('#sheets')).y, SLOWLY).toBeLessThan(-100);
    const line = await box('.watchline');
    expect(line.y).toBe(0);
    expect(line.height).toBeLessThan(50);
    expect((await box('#freshness')).y).toBeGreaterThanOrEqual(0);
  });

  it('draws nothing of a front beyond the ends of its bed', async () => {
    plant.moment = { charged: 0.99, mode: 'stand' };
    plant.step();
    const { page } = await open();
    await page.waitForSelector('.front .width', { state: 'attached' });
    const ends = await page.locator('[data-store="hot"] .bed').evaluate((svg) => {
      const box = (selector: string) => svg.querySelector<SVGGraphicsElement>(selector)!.getBBox();
      const [wall, width] = [box('.wall'), box('.front .width')];
      const fronts = [...svg.querySelectorAll<SVGGraphicsElement>('.tube-fronts path')];
      const lowest = Math.max(...fronts.map((one) => one.getBBox().y));
      return { bed: wall.y + wall.height, width: width.y + width.height, lowest };
    });
    expect(ends.width).toBeLessThanOrEqual(ends.bed);
    expect(ends.lowest).toBeLessThanOrEqual(ends.bed);
  });

  it('has nothing that axe-core finds with a dialog open, stale or without connection', async () => {
    plant.raise({ kind: 'outlet_near_limit', subject: 'hot', class: 'alarm', priority: 'high' });
    plant.raise({ kind: 'valve_leaks', subject: 'cold' });
    const { page } = await open();
    await page.waitForSelector('.estimate');
    await page.locator('.events [data-action="shelve"]').first().click();
    await page.waitForSelector('dialog[open]');
    expect(await finds(page)).toEqual([]);
    await page.keyboard.press('Escape');
    await page.waitForSelector('dialog', { state: 'detached' });
    plant.stale = true;
    plant.age_s = 840;
    plant.step();
    await page.waitForSelector('#freshness[data-trust="stale"]');
    expect(await finds(page)).toEqual([]);
    await served.server.stop();
    await page.waitForSelector('#freshness[data-trust="lost"]');
    expect(await axeFinds(page)).toEqual([]);
    await page.evaluate(() => {
      location.hash = '#site';
    });
    await page.waitForSelector('.units');
    expect(await axeFinds(page)).toEqual([]);
  }, 90_000);

  it('carries the caution', async () => {
    const { page } = await open();
    const words = (await page.locator('footer').textContent())!;
    for (const part of [
      'advises and trips nothing',
      'pressure, heat, cold and oxygen deficiency',
      'local codes and licensed people',
    ]) {
      expect(words.replace(/\s+/g, ' ')).toContain(part);
    }
  });

  it.each([
    [1920, 1080],
    [1280, 800],
    [390, 844],
    [320, 640],
  ])(
    'at %i x %i stays within the width, says nothing on the console and asks nobody else',
    async (width, height) => {
      plant.raise({
        kind: 'sensor_rejected',
        subject: `hot.${'x'.repeat(90)}`,
        message: 'm'.repeat(200),
      });
      for (const dark of [false, true]) {
        const { page, said, foreign } = await open({ width, height, dark });
        await page.waitForSelector('.estimate');
        await page.waitForSelector('[data-chart="hours"] canvas');
        plant.step();
        await page.fill('#power', '1.4');
        await page.keyboard.press('Enter');
        await page.waitForSelector('.asked li');
        for (const summary of await page.locator('summary').all()) await summary.click();
        const sizes = await page.evaluate(() => [document.documentElement.scrollWidth, innerWidth]);
        expect(sizes[0]).toBeLessThanOrEqual(sizes[1]!);
        expect(said).toEqual([]);
        expect(foreign).toEqual([]);
      }
    },
  );

  it('works below a path prefix', async () => {
    const other = await serve(plant, folder, { prefix: '/plant/rock' });
    const { page, said } = await open({}, other.url);
    await page.waitForSelector('.estimate');
    expect(said).toEqual([]);
    await page.goto('about:blank');
    await other.server.stop();
  });

  it('does not grow: as many elements and listeners after 400 scans as after 20', async () => {
    const { page } = await open();
    await page.waitForSelector('.estimate');
    const session = await page.context().newCDPSession(page);
    const count = async () => {
      await session.send('HeapProfiler.collectGarbage');
      const { nodes, jsEventListeners } = await session.send('Memory.getDOMCounters');
      return { nodes, jsEventListeners };
    };
    const run = async (scans: number) => {
      for (let i = 0; i < scans; i++) {
        // A small swing, so that marks come and go but their number stays.
        plant.step(i % 2 === 0 ? 0.001 : -0.001);
        if (i % 10 === 0) await new Promise((resolve) => setTimeout(resolve, 20));
      }
      const newest = plant.time();
      await waitFor('the newest state', async () =>
        (
          await page.evaluate(() => document.querySelector('#hours > .when')?.textContent)
        )?.includes(new Date(Date.parse(newest) - 60_000).toISOString().slice(11, 19)),
      );
      return count();
    };
    const early = await run(20);
    const late = await run(400);
    // Bounds of less than one element a scan; what a redraw throws away may await collection.
    expect(late.nodes).toBeLessThan(early.nodes + 400);
    expect(late.jsEventListeners).toBeLessThanOrEqual(early.jsEventListeners + 20);
  });
});
