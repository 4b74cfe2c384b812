import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { pathToFileURL } from 'node:url';
import fc from 'fast-check';
import type { Browser } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { escapeText } from '../../../src/adapters/report/escape.js';
import { reportHtml } from '../../../src/adapters/report/html.js';
import { plot } from '../../../src/adapters/report/plot.js';
import { REPORT_TABLES, reportCsv } from '../../../src/adapters/report/reportCsv.js';
import { causesOf } from '../../../src/core/watch/causes.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import { temporaryFolder } from '../../support/folders.js';
import { requireProgram } from '../../support/requirements.js';
import { openBrowser } from '../page/browser.js';
import { cycles, FROM, indicator, report } from './reportPlant.js';

describe('the sheet', () => {
  it('escapes every text of the plant', () => {
    const html = reportHtml(report({ unit_name: '<img src=x onerror=alert(1)>' }));
    expect(html).not.toContain('<img');
    expect(html).toContain('&lt;img src=x');
    expect(escapeText(`&<>"'`)).toBe('&amp;&lt;&gt;&quot;&#39;');
  });

  it('has findings before all that they rest on, and the cautions', () => {
    const html = reportHtml(report());
    const order = [
      'Findings',
      'Fronts over the runs',
      'Thermocouples',
      'Runs',
      'Alarms and alerts',
    ];
    const places = order.map((title) => html.indexOf(`<h2>${title}</h2>`));
    expect(places.every((place, i) => place > (places[i - 1] ?? 0))).toBe(true);
    expect(html).toContain('displaces oxygen');
  });

  it('asks for nothing from outside and holds no script', () => {
    const html = reportHtml(report());
    expect(html).not.toMatch(/<script|<link|<iframe|src=|url\(|@import/i);
    expect(html.match(/https?:\/\//g) ?? []).toEqual([]);
  });

  it('has with each discharge what was told of its end, to the minute', () => {
    const html = reportHtml(report({ cycles: cycles(3) }));
    const told = cycles(3)[2]!.told!;
    const cell = (iso: string) => `<td class="n">${iso.slice(11, 16)}</td>`;
    expect(html).toContain(`${cell(told.end)}${cell(told.firm_end)}`);
    expect(html.split('<td class="n">-</td><td class="n">-</td>').length).toBeGreaterThan(2);
  });

  it('says what was left out where there are too many rows', () => {
    const html = reportHtml(report({ cycles: cycles(200) }));
    expect(html).toContain('80 earlier runs are left out here');
  });
});

describe('alarms and alerts in the sheet', () => {
  const event = (id: string, hour: number, transition: 'raised' | 'returned', alarm = false) =>
    ({
      ...{ id, kind: 'k', subject: 's', transition, class: alarm ? 'alarm' : 'alert' },
      ...{ message: `${id} ${transition} at ${hour}`, value: null },
      time: new Date(FROM + hour * 3_600_000).toISOString(),
    }) as unknown as WatchEvent;

  it('are one row each, what stands before what has returned, with what was said last', () => {
    const often = [1, 2, 3].flatMap((h) => [
      event('often', h, 'raised'),
      event('often', h + 0.5, 'returned'),
    ]);
    const html = reportHtml(
      report({
        events: [...often, event('alarm', 4, 'raised', true), event('early', 5, 'returned')],
      }),
    );
    const part = html.slice(html.indexOf('<h2>Alarms and alerts</h2>'));
    const rows = [...part.matchAll(/<tr>(<td.*?)<\/tr>/g)].map(([, row]) => row!);
    expect(rows).toHaveLength(3);
    expect(rows[0]).toContain('alarm raised at 4');
    expect(rows[0]).toContain('stands');
    expect(rows[1]).toContain('often raised at 3');
    expect(rows[1]).toContain('<td class="n">3</td>');
    expect(rows[1]).toContain('01-01 03:30');
    expect(rows[2]).toContain('<td class="n">0</td>');
  });
});

describe('a plot', () => {
  const frame = {
    title: 'T',
    y_label: 'm',
    x: { kind: 'time', from: FROM, to: FROM + 864e5 },
  } as const;

  it('draws whatever numbers come, within its frame and without NaN', () => {
    const value = fc.option(fc.double({ min: -1e6, max: 1e6, noNaN: true }), { nil: null });
    fc.assert(
      fc.property(fc.array(value, { minLength: 1, maxLength: 40 }), fc.boolean(), (ys, marks) => {
        const points = ys.map((y, i) => ({ x: FROM + i * 2e6, y, sigma: marks ? 1 : null }));
        const svg = plot({ ...frame, series: [{ label: 's', look: 'solid', points, marks }] });
        expect(svg).not.toMatch(/NaN|Infinity|undefined/);
        if (ys.every((y) => y === null)) expect(svg).toContain('nothing was recorded');
        else {
          for (const [, cy] of svg.matchAll(/cy="([-\d.]+)"/g)) {
            expect(Number(cy)).toBeGreaterThanOrEqual(0);
            expect(Number(cy)).toBeLessThanOrEqual(170);
          }
        }
      }),
      { seed: 3, numRuns: 200 },
    );
  });

  it('breaks a line where nothing is known', () => {
    const points = [1, null, 2].map((y, i) => ({ x: FROM + i * 1e6, y }));
    const svg = plot({ ...frame, series: [{ label: 's', look: 'solid', points }] });
    const path = /class="line" d="([^"]*)"/.exec(svg)?.[1] ?? '';
    expect(path.match(/M/g)).toHaveLength(2);
  });

  it('keeps the names of the series apart', () => {
    const series = ['a', 'b', 'c', 'd'].map((label) => ({
      ...{ label, look: 'solid' as const, points: [{ x: FROM, y: 1 }] },
    }));
    const svg = plot({ ...frame, series });
    const at = [...svg.matchAll(/class="label" x="[\d.]+" y="([\d.]+)"/g)].map(([, y]) =>
      Number(y),
    );
    expect(at).toHaveLength(4);
    for (let i = 1; i < at.length; i++) expect(at[i]! - at[i - 1]!).toBeGreaterThanOrEqual(12.9);
  });
});

describe('the runs as CSV', () => {
  it('have a row per run and store, and fields that a spreadsheet takes for no formula', () => {
    const text = reportCsv(report({ cycles: cycles(3, { raised: ['=cmd()', 'a,"b"'] }) }));
    const lines = text.split('\r\n');
    expect(lines).toHaveLength(3 * 2 + 2);
    expect(lines[0]?.split(',').slice(0, 4)).toEqual(['run', 'kind', 'from', 'to']);
    expect(lines[1]).toContain(`"'=cmd() a,""b"""`);
    expect(lines[1]).toContain('axis=1.01 rim=0.98');
    // Between the widths at a quarter and at three quarters, which were not passed.
    expect(lines[1]).toContain(',,,0.8,1.02,,,');
  });
});

const chromium = requireProgram('chromium');

describe('the other tables as CSV', () => {
  it.each(REPORT_TABLES)('%s: a head, and rows of as many fields', (table) => {
    const event = { id: 'u/k/s', kind: 'k', subject: 's', message: 'm', time: 't', value: null };
    const data = report({
      indicators: [indicator({})],
      events: [event as unknown as WatchEvent],
    });
    const [head, ...rows] = reportCsv(data, table).trimEnd().split('\r\n');
    // Commas outside of quotes, and one.
    const fields = (line: string) => line.replace(/"([^"]|"")*"/g, '').split(',').length;
    expect(rows.length).toBeGreaterThan(0);
    for (const row of rows) expect(fields(row)).toBe(fields(head!));
  });
});

describe.skipIf(!chromium)('in a browser', { timeout: 60_000 }, () => {
  let browser: Browser;
  beforeAll(async () => {
    browser = await openBrowser(chromium!);
  }, 60_000);
  afterAll(() => browser?.close());

  it('opens without a word and prints on A4', async () => {
    const file = join(temporaryFolder('report'), 'report.html');
    const bad = indicator({});
    writeFileSync(file, reportHtml(report({ indicators: [bad], causes: causesOf([bad]) })));
    const page = await browser.newPage({ viewport: { width: 390, height: 844 } });
    const said: string[] = [];
    page.on('console', (message) => said.push(message.text()));
    page.on('request', (request) => {
      if (!request.url().startsWith('file:')) said.push(request.url());
    });
    await page.goto(pathToFileURL(file).href);
    expect(await page.locator('svg').count()).toBeGreaterThanOrEqual(7);
    // Nothing is wider than a phone but the tables, which scroll by themselves.
    const wide = await page.evaluate(() => document.documentElement.scrollWidth);
    expect(wide).toBeLessThanOrEqual(390);
    const pdf = await page.pdf({ preferCSSPageSize: true });
    expect(pdf.subarray(0, 5).toString()).toBe('%PDF-');
    expect(said).toEqual([]);
    await page.close();
  });
});
