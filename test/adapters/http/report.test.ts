import { afterEach, describe, expect, it } from 'vitest';
import { STYLE_HASH } from '../../../src/adapters/report/style.js';
import { testApp } from './httpApp.js';

type Built = Awaited<ReturnType<typeof testApp>>;
let built: Built | null = null;
afterEach(async () => {
  await built?.app.close();
  built = null;
});

const SPAN = 'from=2026-01-01T00:00:00Z&to=2026-02-01T00:00:00Z';

describe('GET /api/units/{unit}/report', () => {
  it('gives the sheet under a policy that lets its own style through and no script', async () => {
    built = await testApp();
    const answer = await built.app.inject(`/api/units/north/report?${SPAN}`);
    expect(answer.statusCode).toBe(200);
    expect(answer.headers['content-type']).toBe('text/html; charset=utf-8');
    const policy = String(answer.headers['content-security-policy']);
    expect(policy).toContain("default-src 'none'");
    expect(policy).toContain(`style-src '${STYLE_HASH}'`);
    expect(policy).not.toMatch(/script-src|unsafe/);
    expect(answer.body).toBe('report as html');
    expect(built.plant.reportsAsked).toEqual([
      {
        ...{ from_ms: Date.UTC(2026, 0, 1), to_ms: Date.UTC(2026, 1, 1) },
        ...{ format: 'html', table: 'runs' },
      },
    ]);
  });

  it.each([
    ['json', undefined, 'application/json; charset=utf-8', 'north-report.json'],
    ['csv', 'events', 'text/csv; charset=utf-8; header=present', 'north-report-events.csv'],
  ])('gives %s to be kept as a file', async (format, table, type, name) => {
    built = await testApp();
    const asked = table === undefined ? '' : `&table=${table}`;
    const answer = await built.app.inject(
      `/api/units/north/report?${SPAN}&format=${format}${asked}`,
    );
    expect(answer.headers['content-type']).toBe(type);
    expect(answer.headers['content-disposition']).toBe(`attachment; filename="${name}"`);
    expect(answer.body).toBe(`report as ${format}`);
  });

  it.each([
    ['an unknown unit', '/api/units/nowhere/report', 404],
    [
      'a span that ends before it begins',
      '/api/units/north/report?from=2026-02-01T00:00:00Z&to=2026-01-01T00:00:00Z',
      400,
    ],
    ['a strange format', `/api/units/north/report?${SPAN}&format=pdf`, 400],
    ['a strange table', `/api/units/north/report?${SPAN}&format=csv&table=all`, 400],
  ])('refuses %s, naming it', async (_, url, status) => {
    built = await testApp();
    const answer = await built.app.inject(url);
    expect(answer.statusCode).toBe(status);
    expect(answer.json().error.message.length).toBeGreaterThan(10);
    expect(built.plant.reportsAsked).toEqual([]);
  });
});
