import type { Page } from 'playwright-core';

/** Blocks of which the last asks for more than two such stores can give. */
const SHORTFALL = '18:00, 21:00, 1.8\n21:00, 23:00, 1.2\n23:30, 06:00, 1.8';

/** What somebody would do at a part before there is anything to look at, by its path. */
const DONE: Readonly<Record<string, (page: Page) => Promise<void>>> = {
  'offer/schedule': async (page) => {
    await page.fill('textarea[name="schedule"]', SHORTFALL);
    await page.click('form button[type="submit"]');
    await page.waitForSelector('.schedule-view', { timeout: 90_000 });
  },
};

/** Does what has to be done at a part, each time anew; a part that asks by itself needs nothing. */
export async function prepare(page: Page, path: string): Promise<void> {
  await DONE[path]?.(page);
}

interface Opened {
  readonly name: string;
  /** The whole sheet, not only what is in view. */
  readonly whole: boolean;
  /** False where there is nothing to be opened. */
  open(page: Page): Promise<boolean>;
}

/** Further things to look at on a part, by a name of their own. */
export const OPENED: Readonly<Record<string, readonly Opened[]>> = {
  now: [
    {
      ...{ name: 'now-shelve', whole: false },
      async open(page) {
        const button = page.locator('#alarms [data-action="shelve"]').first();
        if ((await button.count()) === 0) return false;
        await button.click();
        await page.waitForSelector('dialog[open]');
        return true;
      },
    },
    {
      ...{ name: 'now-acknowledged', whole: true },
      async open(page) {
        const buttons = page.locator('#alarms [data-action="acknowledge"]');
        if ((await buttons.count()) === 0) return false;
        await page.fill('#who', 'night shift');
        for (let left = await buttons.count(); left > 0; left--) {
          await buttons.first().click();
          await page.waitForFunction(
            (fewer) => document.querySelectorAll('[data-action="acknowledge"]').length < fewer,
            left,
          );
        }
        return true;
      },
    },
  ],
};
