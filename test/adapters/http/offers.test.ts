import { afterEach, describe, expect, it } from 'vitest';
import {
  offersHistorySchema,
  offersReportSchema,
  offersSchema,
} from '../../../src/adapters/http/schema/offers.js';
import { testApp } from './httpApp.js';

type Built = Awaited<ReturnType<typeof testApp>>;
let built: Built | null = null;

async function app(): Promise<Built> {
  built = await testApp();
  return built;
}

afterEach(async () => {
  await built?.app.close();
  built = null;
});

const URL = '/api/units/north/offers';
const BODY = {
  powers_MW_el: [1, 2],
  starts: ['2026-01-31T08:00:00Z', '2026-01-31T18:00:00+01:00'],
  block_min: 30,
  certainties: [0.5, 0.9],
};

function post({ app: own }: Built, payload: object, headers: Record<string, string> = {}) {
  return own.inject({ method: 'POST', url: URL, payload, headers });
}

describe('POST /api/units/{unit}/offers', () => {
  it('answers per power and start with the head of every answer, and keeps the table', async () => {
    const own = await app();
    const answer = await post(own, BODY);
    expect(answer.statusCode).toBe(200);
    const table = offersSchema.strict().parse(answer.json());
    expect(table).toMatchObject({ unit: 'north', time: own.plant.time(), stale: false, kept: 1 });
    expect(table.age_s).toBe(4);
    expect(table.given).toContain('the machine runs');
    expect(table.offers.map((one) => [one.power_MW_el, one.start])).toEqual([
      [1, '2026-01-31T08:00:00Z'],
      [2, '2026-01-31T08:00:00Z'],
      [1, '2026-01-31T17:00:00Z'],
      [2, '2026-01-31T17:00:00Z'],
    ]);
    const [first] = table.offers;
    expect(first!.blocks[0]).toMatchObject({
      from: '2026-01-31T08:00:00Z',
      to: '2026-01-31T08:30:00Z',
      most_MWh_el: 0.5,
    });
  });

  it('passes the plan, the horizon, the prices and the clock on to the core', async () => {
    const own = await app();
    await post(own, {
      ...BODY,
      plan: [
        {
          ...{ mode: 'charge', power_MW_el: 3 },
          ...{ from: '2026-01-31T06:30:00Z', to: '2026-01-31T07:30:00Z' },
        },
      ],
      horizon_h: 2,
      prices: { shortfall_per_MWh_el: 90, surplus_per_MWh_el: 30 },
    });
    const now_ms = Date.parse(own.plant.time());
    expect(own.plant.planAsked[0]).toEqual({
      kind: 'offers',
      ask: {
        powers_W: [1e6, 2e6],
        starts_ms: [Date.UTC(2026, 0, 31, 8), Date.UTC(2026, 0, 31, 17)],
        block_s: 1800,
        certainties: [0.5, 0.9],
        legs: [
          {
            ...{ mode: 'charge', power_W: 3e6 },
            from_ms: Date.UTC(2026, 0, 31, 6, 30),
            to_ms: Date.UTC(2026, 0, 31, 7, 30),
          },
        ],
        horizon_s: 7200,
        prices: { shortfall_per_MWh_el: 90, surplus_per_MWh_el: 30 },
        asked_ms: now_ms + 4000,
      },
    });
  });

  it.each([
    [{ starts: ['2026-01-31T05:00:00Z'] }, 'starts.0', '06:30:00Z or later: that time is past'],
    [{ starts: ['2026-01-31T08:10:00Z'] }, 'starts.0', 'the beginning of a block of 30 min'],
    [{ starts: ['2026-01-31T08:10:00'] }, 'starts.0', 'a time zone for local times'],
    [{ starts: ['2026-01-31T08:10'], gate: { closes_before_min: 1 } }, 'starts.0', 'time zone'],
    [{ block_min: 20 }, 'block_min', '15, 30 or 60'],
    [{ powers_MW_el: [-1] }, 'powers_MW_el.0', 'each above 0'],
    [{ certainties: [0.3] }, 'certainties.0', '0.50 to 0.99'],
    [{ horizon_h: 0.7 }, 'horizon_h', 'a multiple of the block of 0.5 h'],
    [{ gate: { closes_before_min: 60 } }, 'starts', 'none beside a gate'],
    [
      {
        plan: [
          { mode: 'stand', from: '2026-01-31T06:30:00Z', to: '2026-01-31T07:30:00Z' },
          { mode: 'stand', from: '2026-01-31T07:00:00Z', to: '2026-01-31T08:00:00Z' },
        ],
      },
      'plan.1.from',
      'legs in order',
    ],
    [
      { plan: [{ mode: 'stand', from: '2026-01-31T06:00:03Z', to: '2026-01-31T07:30:00Z' }] },
      'plan.0.from',
      '06:00:04Z or later: that time is past',
    ],
    [{ power: 3 }, 'power', 'only powers_MW_el'],
  ])('refuses %j, naming the field and what would be right', async (over, field, expected) => {
    const answer = await post(await app(), { ...BODY, ...over });
    expect(answer.statusCode).toBe(400);
    const { error } = answer.json();
    expect(error.field).toBe(field);
    expect(error.expected).toContain(expected);
    if (field === 'horizon_h') expect(error.value).toBeCloseTo(0.7, 12);
    expect(built?.plant.kept).toEqual([]);
  });

  it('refuses a stale estimate unless it is to be marked', async () => {
    const own = await app();
    own.plant.stale = true;
    const refused = await post(own, BODY);
    expect([refused.statusCode, refused.json().error.code]).toEqual([503, 'estimate_stale']);
    const marked = await post(own, { ...BODY, stale: 'mark' });
    expect([marked.statusCode, marked.json().stale]).toEqual([200, true]);
  });
});

describe('GET /api/units/{unit}/offers', () => {
  it('answers the simple case from a gate on, and keeps it only where asked', async () => {
    const { get, plant } = await app();
    const query = 'power_MW=1,2&closes_before_min=60&count=3&every_min=60&certainty=0.9';
    const table = offersSchema.strict().parse((await get(`${URL}?${query}`)).json());
    expect(table).toMatchObject({ block_s: 900, certainties: [0.9], kept: null });
    expect(plant.planAsked[0]).toMatchObject({
      ask: { gate: { closes_before_s: 3600, count: 3, every_s: 3600 } },
    });
    expect(plant.kept).toHaveLength(0);
    expect((await get(`${URL}?${query}&keep=true`)).json().kept).toBe(1);
  });

  it('needs no start: the next block then', async () => {
    const { get, plant } = await app();
    expect((await get(`${URL}?power_MW=1`)).statusCode).toBe(200);
    expect(plant.planAsked[0]).toMatchObject({ ask: { gate: { closes_before_s: 0, count: 1 } } });
  });

  it('gives CSV by format and by Accept, a row per part and certainty', async () => {
    const { get } = await app();
    const query = 'power_MW=2&start=2026-01-31T08:00:00Z&block_min=60&certainty=0.5,0.9';
    const byFormat = await get(`${URL}?${query}&format=csv`);
    expect(byFormat.headers['content-type']).toContain('text/csv');
    const byAccept = await get(`${URL}?${query}`, { accept: 'text/csv' });
    expect(byAccept.body).toBe(byFormat.body);
    const [header, ...rows] = byFormat.body.trimEnd().split('\r\n');
    expect(header).toMatch(
      /^unit,time,age_s,valid_until,stale,quality,power_MW_el,start,part,from,to,certainty,energy_MWh_el,/,
    );
    // 0.62 x 16 MWh at 2 MW: 4.96 h, at most 1.1 of it, so six blocks; two certainties each.
    expect(rows).toHaveLength(2 * (1 + 6));
    for (const row of rows) expect(row).toMatch(/^north,2026[^,]*Z,4,2026[^,]*Z,false,good,2,/);
    const blocks = rows.map((row) => row.split(',')).filter((row) => row[8] === 'block');
    const sum = blocks
      .filter((row) => row[11] === '0.9')
      .reduce((a, row) => a + Number(row[12]), 0);
    const whole = rows.map((row) => row.split(',')).find((row) => row[11] === '0.9')!;
    // Nine digits of each.
    expect(sum).toBeCloseTo(Number(whole[12]), 7);
  });

  it('refuses one price alone', async () => {
    const { get } = await app();
    const { error } = (await get(`${URL}?power_MW=1&shortfall_per_MWh_el=80`)).json();
    expect(error).toMatchObject({ field: 'surplus_per_MWh_el', value: null });
    expect(error.expected).toContain('both prices or none');
  });

  it.each([
    ['start=2026-01-31T08:00:00Z&count=5', 'start', '2026-01-31T08:00:00Z', 'none beside closes_'],
    ['start=2026-01-31T05:00:00Z', 'start.0', '2026-01-31T05:00:00Z', 'that time is past'],
    [
      'closes_before_min=60&count=2&every_min=7',
      'every_min',
      7,
      'a multiple of the block of 15 min',
    ],
    ['horizon_h=0.3', 'horizon_h', 0.3, 'a multiple of the block of 0.25 h'],
    ['horizon_h=60', 'horizon_h', 60, 'at most 50 h: 200 blocks'],
    ['power_MW=1,1.1,1.2,1.3,1.4&count=12', 'power_MW x start', 60, 'at most 48 together'],
    [
      'power_MW=1,1.1,1.2,1.3&count=8&certainty=0.5,0.6,0.7,0.8,0.9,0.95',
      'power_MW x start x blocks x certainty',
      expect.any(Number),
      'at most 24000 together: fewer of them, longer blocks or a shorter horizon',
    ],
  ])('names what is wrong with %s in its own words', async (query, field, value, expected) => {
    const { get } = await app();
    const asked = query.includes('power_MW') ? query : `power_MW=1&${query}`;
    const answer = await get(`${URL}?${asked}`);
    expect(answer.statusCode).toBe(400);
    const { error } = answer.json();
    expect([error.field, error.value]).toEqual([field, value]);
    expect(error.expected).toContain(expected);
  });

  it('answers once what is asked twice, without noise of the arithmetic', async () => {
    const { get } = await app();
    const start = '2026-01-31T08:00:00Z';
    const query = `power_MW=1.8,1.1,1.8&start=${start},${start}&certainty=0.9,0.5,0.9`;
    const answer = await get(`${URL}?${query}`);
    const { offers, certainties } = answer.json();
    expect(certainties).toEqual([0.9, 0.5]);
    expect(offers.map((offer: { power_MW_el: number }) => offer.power_MW_el)).toEqual([1.8, 1.1]);
    const figures = answer.body.match(/"\w+_(MWh_el|MW_el)":[\d.e-]+/g) ?? [];
    expect(figures.length).toBeGreaterThan(20);
    for (const figure of figures) {
      const digits = figure
        .split(':')[1]!
        .replace(/e.*/, '')
        .replace(/^0\.0*|\./g, '');
      expect(digits.length, figure).toBeLessThanOrEqual(9);
    }
  });
});

describe('kept offers', () => {
  it('are listed without their blocks, and each is had as it was answered', async () => {
    const own = await app();
    const first = (await post(own, BODY)).json();
    await post(own, { ...BODY, powers_MW_el: [1.5] });
    const list = offersHistorySchema.strict().parse((await own.get(`${URL}/history`)).json());
    expect(list.tables.map((table) => [table.no, table.offers.length])).toEqual([
      [2, 2],
      [1, 4],
    ]);
    own.plant.step();
    expect((await own.get(`${URL}/history/1`)).json()).toEqual(first);
    const none = await own.get(`${URL}/history/7`);
    expect([none.statusCode, none.json().error.code]).toEqual([404, 'unknown_offers']);
  });

  it('say where older ones are left out', async () => {
    const own = await app();
    for (let i = 0; i < 2; i++) await post(own, BODY);
    expect((await own.get(`${URL}/history`)).json().older_left_out).toBe(false);
    const [{ summary, answer }] = own.plant.kept as [(typeof own.plant.kept)[0]];
    while (own.plant.kept.length < 101) own.plant.kept.push({ summary, answer });
    const list = offersHistorySchema.strict().parse((await own.get(`${URL}/history`)).json());
    expect([list.tables.length, list.older_left_out]).toEqual([100, true]);
  });

  it('are reported against what was delivered', async () => {
    const own = await app();
    const empty = offersReportSchema.strict().parse((await own.get(`${URL}/report`)).json());
    expect(empty.p90).toEqual({ kept: 0, of: 0, meant: 0.9, share: null, interval: null });
    expect(empty.tested_by).toContain('until a rule ended it');
    own.plant.report = {
      p90: { kept: 9, of: 10, meant: 0.9, share: 0.9, interval: [0.6, 0.98] },
      p50: { kept: 5, of: 10, meant: 0.5, share: 0.5, interval: [0.24, 0.76] },
      tables: 2000,
      older_left_out: true,
      tested: [],
      untested: empty.untested,
    };
    const report = offersReportSchema.strict().parse((await own.get(`${URL}/report`)).json());
    expect(report.p90.interval).toEqual([0.6, 0.98]);
    expect(report).toMatchObject({ tables: 2000, older_left_out: true });
    const wrong = await own.get(`${URL}/report?from=2026-02-02T00:00:00Z&to=2026-02-01T00:00:00Z`);
    expect([wrong.statusCode, wrong.json().error.field]).toEqual([400, 'from']);
  });
});
