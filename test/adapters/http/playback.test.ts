import { afterEach, describe, expect, it } from 'vitest';
import { unitHistorySchema } from '../../../src/adapters/http/schema/answers.js';
import {
  playbackSchema,
  unitProfileSchema,
  watchHistorySchema,
} from '../../../src/adapters/http/schema/playback.js';
import type { IndicatorView } from '../../../src/core/watch/indicator.js';
import { testApp } from './httpApp.js';

let close: (() => Promise<unknown>) | null = null;
afterEach(async () => {
  await close?.();
  close = null;
});

/** A scripted plant that has kept a profile each half minute for `scans` scans. */
async function played(scans = 6) {
  const { app, get, plant } = await testApp();
  close = () => app.close();
  for (let n = 0; n < scans; n++) {
    const { profile, estimate, flow_kg_s, power_MW_el } = plant.now('north')!;
    plant.storedMoments.push({ profile: profile!, estimate, flow_kg_s, power_MW_el });
    plant.step();
  }
  return { get, plant };
}

const indicator = (kind: IndicatorView['kind'], value: number | null): IndicatorView => ({
  ...{ kind, subject: 'hot', value, sigma: 0.1, unit: '-', healthy: 1, healthy_from: 'twin' },
  ...{ limit: 1.5, deadband: 0.1, on_delay_s: 60, off_delay_s: 60, score: 0.2 },
  ...{ state: 'normal', reason: null, time: null, sentence: 'By the script.' },
});

describe('stored profiles', () => {
  it('come with the estimate of their time, as the present one does', async () => {
    const { get, plant } = await played();
    const answer = await get('/api/units/north/profiles');
    const { profiles, ...head } = playbackSchema.strict().parse(answer.json());
    expect(head).toMatchObject({ unit: 'north', thinned: false, every_s: 600 });
    expect(profiles).toHaveLength(6);
    const now = unitProfileSchema.strict().parse((await get('/api/units/north/profile')).json());
    const { age_s: _, ...last } = now;
    expect(Object.keys(profiles[0]!)).toEqual(Object.keys(last));
    profiles.forEach((one, n) => {
      expect([one.time, one.estimate!.time]).toEqual([plant.time(n), plant.time(n)]);
      const [front] = one.estimate!.stores.hot!.fronts;
      expect(front!.position_m).toBeCloseTo(8 * one.estimate!.state_of_charge, 9);
      expect(one.stores.hot!.readings.length).toBeGreaterThan(0);
      expect(one.stores.hot!.tubes[0]!.sigma_K).toHaveLength(100);
    });
  });

  it('are no more than asked for, and without sigma where that is not wanted', async () => {
    const { get } = await played();
    const answer = await get('/api/units/north/profiles?points=4&sigma=no');
    const { profiles, thinned } = playbackSchema.strict().parse(answer.json());
    expect([profiles.length, thinned]).toEqual([4, true]);
    for (const { stores } of profiles) {
      for (const { tubes } of Object.values(stores)) {
        expect(tubes.map((tube) => tube.sigma_K)).toEqual(tubes.map(() => undefined));
        expect(tubes[0]!.temperature_degC).toHaveLength(100);
      }
    }
    for (const query of ['points=201', 'sigma=perhaps', 'from=yesterday']) {
      expect((await get(`/api/units/north/profiles?${query}`)).statusCode, query).toBe(400);
    }
  });

  it('are found at or before a time, or it is said that there is none', async () => {
    const { get, plant } = await played();
    const at = (time_ms: number) =>
      get(`/api/units/north/profile?time=${new Date(time_ms).toISOString()}`);
    const third = Date.parse(plant.time(3));
    const found = unitProfileSchema.strict().parse((await at(third + 29_999)).json());
    expect([found.time, found.age_s]).toEqual([plant.time(3), 4 + 3 * 30]);
    const none = await at(Date.parse(plant.time(0)) - 1);
    expect([none.statusCode, none.json().error]).toMatchObject([
      404,
      { code: 'nothing_stored', field: 'time' },
    ]);
  });
});

describe('what indicators showed', () => {
  it('is given as columns beside the times, with null where one was not there', async () => {
    const { get, plant } = await played(1);
    const views = [
      [indicator('spread_ratio', 1.1)],
      [indicator('spread_ratio', 1.2), indicator('heat_transfer', 0.9)],
      [indicator('heat_transfer', null)],
    ];
    views.forEach((indicators, n) => {
      plant.storedWatch.push({ time: plant.time(n - 5), unit: 'north', indicators, causes: [] });
    });
    const answer = await get('/api/units/north/watch/history');
    const { times, indicators } = watchHistorySchema.strict().parse(answer.json());
    expect(times).toEqual([plant.time(-5), plant.time(-4), plant.time(-3)]);
    const columns = indicators.map(({ kind, value, state }) => [kind, value, state]);
    expect(columns).toEqual([
      ['spread_ratio', [1.1, 1.2, null], ['normal', 'normal', null]],
      ['heat_transfer', [null, 0.9, null], [null, 'normal', 'normal']],
    ]);
    const one = await get('/api/units/north/watch/history?kinds=heat_transfer&points=2');
    const chosen = watchHistorySchema.parse(one.json());
    expect(chosen.indicators.map(({ kind }) => kind)).toEqual(['heat_transfer']);
    expect([chosen.times.length, chosen.thinned]).toEqual([2, true]);
    const wrong = await get('/api/units/north/watch/history?kinds=mood');
    expect([wrong.statusCode, wrong.json().error.field]).toEqual([400, 'kinds']);
  });
});

describe('a thinned history', () => {
  it('has the extremes after each series, in rows and in columns of CSV', async () => {
    const { get, plant } = await played(1);
    plant.bucket_ms = 7_200_000;
    const url = '/api/units/north/history?series=quality,state_of_charge&points=3';
    const history = unitHistorySchema.strict().parse((await get(url)).json());
    expect(history).toMatchObject({ thinned: true, bucket_s: 7200 });
    expect(history.series).toEqual(['quality', 'state_of_charge']);
    const columns = ['time', 'quality', 'state_of_charge'];
    const extremes = ['state_of_charge.min', 'state_of_charge.max'];
    expect(Object.keys(history.rows[0]!)).toEqual([...columns, ...extremes]);
    const csv = await get(`${url}&format=csv`);
    expect(csv.body.split('\r\n')[0]).toBe([...columns, ...extremes].join(','));
  });

  it('gives extremes of single rows where they are asked for by name', async () => {
    const { get } = await played(1);
    const url = '/api/units/north/history?series=state_of_charge,state_of_charge.min&points=2';
    const { rows, thinned } = unitHistorySchema.parse((await get(url)).json());
    expect(thinned).toBe(false);
    for (const row of rows) expect(row['state_of_charge.min']).toBe(row.state_of_charge);
  });
});
