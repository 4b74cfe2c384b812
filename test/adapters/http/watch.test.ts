import { afterEach, describe, expect, it } from 'vitest';
import { cyclesSchema, watchSchema } from '../../../src/adapters/http/schema/watch.js';
import type { WatchView } from '../../../src/core/watch/causes.js';
import type { IndicatorView } from '../../../src/core/watch/indicator.js';
import { run, script } from '../../core/watch/cycleScript.js';
import { testApp } from './httpApp.js';

type Built = Awaited<ReturnType<typeof testApp>>;
let built: Built | null = null;
afterEach(async () => {
  await built?.app.close();
  built = null;
});

const indicator: IndicatorView = {
  ...{ kind: 'heat_transfer', subject: 'hot', value: 0.6, sigma: 0.05, unit: '-' },
  ...{ healthy: 1, healthy_from: 'learned', limit: 0.7, deadband: 0.1 },
  ...{ on_delay_s: 900, off_delay_s: 1800, score: 1, state: 'degraded', reason: null },
  ...{ time: '2026-01-31T06:00:00.000Z', sentence: 'Heat transfer has fallen.' },
};
const watched: WatchView = {
  ...{ time: '2026-01-31T06:00:00.000Z', unit: 'north', indicators: [indicator] },
  causes: [
    {
      ...{ cause: 'dust_or_fines', subject: 'hot', probability: 0.8 },
      ...{ evidence: ['heat transfer is at 60 %'], check: 'Look at the filter.' },
    },
  ],
};

/** Six runs of the days before the scripted plant's time. */
function records() {
  const scans = script([
    { mode: 'stand', scans: 30 },
    { mode: 'charge', scans: 240 },
    { mode: 'stand', scans: 60 },
    { mode: 'discharge', scans: 150 },
    { mode: 'stand', scans: 30 },
  ]);
  const back_ms = Date.UTC(2026, 4, 1) - Date.UTC(2026, 0, 30);
  const found = run(scans.map((scan) => ({ ...scan, time_ms: scan.time_ms - back_ms }))).records;
  return found.map((one) => ({ ...one, unit: 'north', raised: ['north/front_spread/hot'] }));
}

async function app() {
  built = await testApp();
  built.plant.watched = watched;
  built.plant.runs.push(...records());
  return built;
}

describe('GET /api/units/{unit}/watch', () => {
  it('gives indicators and causes with their age', async () => {
    const { get, plant } = await app();
    const answer = await get('/api/units/north/watch');
    const body = watchSchema.strict().parse(answer.json());
    expect(body).toMatchObject({ ...watched, age_s: 4, stale: false });
    plant.watched = null;
    const none = await get('/api/units/north/watch');
    expect(none.statusCode).toBe(503);
    expect(none.json().error.code).toBe('no_estimate_yet');
    expect((await get('/api/units/south/watch')).statusCode).toBe(404);
  });
});

describe('GET /api/units/{unit}/cycles', () => {
  it('gives the runs of the last month, by kind and span where asked', async () => {
    const { get, plant } = await app();
    const body = cyclesSchema.strict().parse((await get('/api/units/north/cycles')).json());
    expect(body.cycles.map(({ kind }) => kind)).toEqual(['stand', 'charge', 'stand', 'discharge']);
    expect(body.older_left_out).toBe(false);
    const charge = body.cycles[1]!;
    expect(charge.drawn_MWh_el).toBe(plant.runs[1]!.drawn_MWh_el);
    expect(charge.ambient_mean_degC).toBeCloseTo(290 - 273.15, 3);
    expect(charge.stores.hot!.widths).toHaveLength(2);
    const kind = (await get('/api/units/north/cycles?kind=discharge')).json();
    expect(kind.cycles).toHaveLength(1);
    expect(kind.cycles[0].round_trip).toBeCloseTo(0.62, 1);
    const from = encodeURIComponent(plant.runs[2]!.from);
    const span = (await get(`/api/units/north/cycles?from=${from}&to=2026-01-30T05:00:00Z`)).json();
    expect(span.cycles.map(({ kind: one }: { kind: string }) => one)).toEqual(['charge', 'stand']);
  });

  it('as CSV with a column for each store and place', async () => {
    const { get, plant } = await app();
    const answer = await get('/api/units/north/cycles?format=csv');
    expect(answer.headers['content-type']).toContain('text/csv');
    const [head, ...rows] = answer.body.trimEnd().split('\r\n');
    const columns = head!.split(',');
    expect(rows).toHaveLength(4);
    const cells = rows.map((row) => row.split(','));
    const cell = (row: number, name: string) => cells[row]![columns.indexOf(name)];
    expect(cell(1, 'kind')).toBe('charge');
    expect(Number(cell(1, 'hot.soc_to'))).toBe(plant.runs[1]!.stores.hot!.soc_to);
    expect(Number(cell(1, 'cold.width_m_at_4_m'))).toBeGreaterThan(0.9);
    expect(cell(0, 'cold.width_m_at_4_m')).toBe('');
    expect(cell(1, 'raised')).toBe('north/front_spread/hot');
    expect(cell(0, 'incomplete')).toBe('began_before');
    expect(cells.every((row) => row.length === columns.length)).toBe(true);
  });

  it('refuses what is no kind, no time, and a span the wrong way round', async () => {
    const { get } = await app();
    for (const [query, field] of [
      ['kind=rest', 'kind'],
      ['from=yesterday', 'from'],
      ['from=2026-01-02T00:00:00Z&to=2026-01-01T00:00:00Z', 'from'],
      ['format=xml', 'format'],
      ['kinds=charge', 'kinds'],
    ]) {
      const answer = await get(`/api/units/north/cycles?${query}`);
      expect(answer.statusCode, query).toBe(400);
      expect(answer.json().error.field, query).toBe(field);
    }
  });
});
