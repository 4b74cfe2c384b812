import { afterEach, describe, expect, it } from 'vitest';
import { scheduleSchema } from '../../../src/adapters/http/schema/schedule.js';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { testApp } from './httpApp.js';
import { COLD, HOT, unitOf } from './scriptedDefinitions.js';
import { ScriptedPlant } from './scriptedPlant.js';

type Built = Awaited<ReturnType<typeof testApp>>;
let built: Built | null = null;

/** The estimate is of 2026-01-31T06:00:00Z; the connection is in Paris. */
async function app(connected = true): Promise<Built> {
  const plain = unitOf('north', 'North unit', [HOT, COLD]);
  const zone = 'Europe/Paris';
  const connection = { time_zone: zone, export_max_W: 3e6, import_max_W: 4e6, windows: [] };
  const unit: UnitDefinition = connected
    ? { ...plain, limits: { ...plain.limits, connection } }
    : plain;
  built = await testApp({ plant: new ScriptedPlant([unit]) });
  return built;
}

afterEach(async () => {
  await built?.app.close();
  built = null;
});

const URL = '/api/units/north/schedule';
const BLOCKS = [
  { mode: 'discharge', power_MW_el: 1.5, from: '2026-01-31T17:00', to: '2026-01-31T18:00' },
  { mode: 'stand', from: '2026-01-31T16:00:00Z', to: '2026-01-31T17:00+01:00' },
];
const CSV = [
  'from,to,mode,power_MW_el',
  '2026-01-31T17:00,2026-01-31T18:00,discharge,1.5',
  '2026-01-31T16:00:00Z,2026-01-31T17:00+01:00,stand,',
  '',
].join('\r\n');

function post(
  { app: own }: Built,
  payload: object | string,
  headers: Record<string, string> = {},
  query = '',
) {
  const type = typeof payload === 'string' ? { 'content-type': 'text/csv' } : {};
  return own.inject({
    method: 'POST',
    url: URL + query,
    payload,
    headers: { ...type, ...headers },
  });
}

const NOON = Date.UTC(2026, 0, 31, 16);
const ASKED = {
  kind: 'schedule',
  ask: {
    blocks: [{ mode: 'discharge', power_W: 1.5e6, from_ms: NOON, to_ms: NOON + 3.6e6 }],
    certainty: 0.9,
    zone: 'Europe/Paris',
    // The wall clock of the script is 4 s past the estimate.
    asked_ms: Date.UTC(2026, 0, 31, 6) + 4000,
  },
};

describe('POST /api/units/{unit}/schedule', () => {
  it('reads JSON in the zone of the connection and answers with the head of every answer', async () => {
    const own = await app();
    const answer = await post(own, { blocks: BLOCKS.slice(0, 1) });
    expect(answer.statusCode).toBe(200);
    expect(own.plant.planAsked).toEqual([ASKED]);
    const body = scheduleSchema.strict().parse(answer.json());
    expect(body).toMatchObject({ unit: 'north', time: own.plant.time(), stale: false, age_s: 4 });
    expect(body.given).toContain('the machine runs');
    expect(body.blocks[0]).toMatchObject({
      from: '2026-01-31T17:00:00+01:00',
      planned_MWh_el: 1.5,
    });
  });

  it('reads CSV as well, its certainty and zone in the query', async () => {
    const own = await app(false);
    const row = CSV.split('\r\n').slice(0, 2).join('\n');
    const answer = await post(own, row, {}, '?zone=Europe/Paris&certainty=0.95');
    expect(answer.statusCode).toBe(200);
    const { ask } = ASKED;
    expect(own.plant.planAsked).toEqual([{ kind: 'schedule', ask: { ...ask, certainty: 0.95 } }]);
    scheduleSchema.strict().parse(answer.json());
  });

  it('writes CSV after RFC 4180, a row per block, by format or by Accept', async () => {
    const own = await app();
    const blocks = [
      // Three digits too many: 0.1 + 0.2 and the like.
      { ...BLOCKS[0], power_MW_el: 1.4999999999999998 },
      { ...BLOCKS[1], from: '2026-01-31T17:00:00Z', to: '2026-01-31T18:00:00Z' },
    ];
    const byFormat = await post(own, { blocks, format: 'csv' });
    const byAccept = await post(own, { blocks }, { accept: 'text/csv' });
    expect(byAccept.body).toBe(byFormat.body);
    expect(byFormat.headers['content-type']).toBe('text/csv; charset=utf-8; header=present');
    const [header, first, second, end] = byFormat.body.split('\r\n');
    expect(end).toBe('');
    const names = header!.split(',');
    const cell = (row: string, name: string) => row.split(',')[names.indexOf(name)];
    expect(cell(first!, 'from')).toBe('2026-01-31T17:00:00+01:00');
    expect(cell(first!, 'power_MW_el')).toBe('1.5');
    expect(cell(first!, 'planned_MWh_el')).toBe('1.5');
    expect(cell(first!, 'state_of_charge_at_end')).toBe('0.5');
    expect(cell(second!, 'hot_soc_at_end')).toBe('0.7');
    expect(cell(second!, 'mode')).toBe('stand');
    expect(header).toMatch(/^unit,time,age_s,valid_until,stale,quality,from,/);
    expect(second).toMatch(/^north,2026[^,]*Z,4,2026[^,]*Z,false,good,/);
    expect(Date.parse(cell(second!, 'valid_until')!)).toBeGreaterThan(NOON - 1e9);
  });

  it.each([
    ['a negative power', { power_MW_el: -1 }, 'blocks.0.power_MW_el', -1, /from 0 to 10000/],
    ['an unknown mode', { mode: 'sell' }, 'blocks.0.mode', 'sell', /one of charge, discharge/],
    [
      'a past start',
      { from: '2026-01-31T06:30' },
      'blocks.0.from',
      '2026-01-31T06:30',
      /07:00:04\+01:00 or later, the present: that time is past/,
    ],
    [
      'a start between the estimate and the wall clock',
      { from: '2026-01-31T07:00:03' },
      'blocks.0.from',
      '2026-01-31T07:00:03',
      /07:00:04\+01:00 or later, the present/,
    ],
    [
      'an end before its start',
      { to: '2026-01-31T16:59' },
      'blocks.0.to',
      '2026-01-31T16:59',
      /later than from/,
    ],
    [
      'a time without its minute',
      { to: '2026-01-31T17' },
      'blocks.0.to',
      '2026-01-31T17',
      /ISO 8601/,
    ],
  ])(
    'refuses %s with field, value and what would be right',
    async (_, change, field, value, expected) => {
      const own = await app();
      const answer = await post(own, { blocks: [{ ...BLOCKS[0], ...change }] });
      expect(answer.statusCode).toBe(400);
      const { error } = answer.json();
      expect(error).toMatchObject({ code: 'wrong_value', field, value });
      expect(error.expected).toMatch(expected);
      expect(own.plant.planAsked).toEqual([]);
    },
  );

  it('refuses overlapping blocks and lists every further fault', async () => {
    const own = await app();
    const answer = await post(own, {
      blocks: [BLOCKS[0], { ...BLOCKS[0], from: '2026-01-31T17:30' }, { ...BLOCKS[0], to: 'x' }],
    });
    const { error } = answer.json();
    expect(error).toMatchObject({ field: 'blocks.2.to', value: 'x' });
    expect(error.others).toMatchObject([
      { field: 'blocks.1.from', expected: expect.stringContaining('may not overlap') },
    ]);
  });

  it('refuses local times where there is no zone, and a CSV by its row', async () => {
    const own = await app(false);
    const answer = await post(own, CSV);
    expect(answer.statusCode).toBe(400);
    expect(answer.json().error).toMatchObject({
      field: 'row 2 from',
      value: '2026-01-31T17:00',
      expected: expect.stringContaining('or a time zone for local times'),
    });
    const header = await post(own, 'from;to;mode\n');
    expect(header.json().error).toMatchObject({
      field: 'row 1',
      expected: 'the columns from,to,mode,power_MW_el',
    });
  });

  it.each([
    [{ blocks: [] }, 'blocks', /1 to 400 blocks/],
    [{ blocks: BLOCKS, certainty: 0.3 }, 'certainty', /from 0.5 to 0.99/],
    [{ blocks: BLOCKS, zone: 'Europe/Atlantis' }, 'zone', /an IANA time zone/],
    [{ blocks: 'all' }, 'blocks', /1 to 400 blocks/],
  ])('refuses the body %j', async (body, field, expected) => {
    const answer = await post(await app(), body);
    expect(answer.statusCode).toBe(400);
    const { error } = answer.json();
    expect(error).toMatchObject({ code: 'wrong_value', field });
    expect(error.expected).toMatch(expected);
  });

  it('refuses a question without a body', async () => {
    const { app: own, plant } = await app();
    for (const headers of [{}, { 'content-type': 'application/json' }]) {
      const payload = 'content-type' in headers ? 'null' : undefined;
      const answer = await own.inject({
        method: 'POST',
        url: URL,
        headers,
        ...(payload ? { payload } : {}),
      });
      expect(answer.statusCode).toBe(400);
      expect(answer.json().error).toMatchObject({
        ...{ code: 'wrong_value', field: 'body', value: null },
        expected: expect.stringMatching(/^an object .*or CSV as text\/csv$/),
      });
    }
    expect(plant.planAsked).toEqual([]);
  });

  it('names every type that it takes where it gets another', async () => {
    const { app: own } = await app();
    const headers = { 'content-type': 'application/xml' };
    const answer = await own.inject({ method: 'POST', url: URL, headers, payload: '<a/>' });
    expect(answer.statusCode).toBe(415);
    expect(answer.json().error.expected).toBe('content-type application/json or text/csv');
  });

  it('names the keys it knows where one is not', async () => {
    const answer = await post(await app(), { blocks: BLOCKS, certain: 0.9 });
    expect(answer.json().error).toMatchObject({
      code: 'unknown_field',
      field: 'certain',
      expected: 'only blocks, certainty, zone, stale, format',
    });
    const within = await post(built as Built, { blocks: [BLOCKS[0], { ...BLOCKS[1], power: 2 }] });
    expect(within.json().error).toMatchObject({
      code: 'unknown_field',
      ...{ field: 'blocks.1.power', value: 2, expected: 'only mode, power_MW_el, from, to' },
    });
  });

  it('takes 400 blocks, refuses more, and a body beyond all of them', async () => {
    const own = await app();
    const many = (count: number) =>
      Array.from({ length: count }, (_, i) => ({
        mode: 'charge',
        power_MW_el: 1.25,
        from: new Date(NOON + i * 9e5).toISOString(),
        to: new Date(NOON + (i + 1) * 9e5).toISOString(),
      }));
    expect((await post(own, { blocks: many(400) })).statusCode).toBe(200);
    const more = await post(own, { blocks: many(401) });
    expect(more.json().error).toMatchObject({ field: 'blocks', expected: '1 to 400 blocks' });
    expect((await post(own, { blocks: many(4000) })).statusCode).toBe(413);
  });

  it('refuses a stale estimate, or marks it, as asked', async () => {
    const own = await app();
    own.plant.stale = true;
    const blocks = BLOCKS.slice(0, 1);
    expect((await post(own, { blocks })).json().error.code).toBe('estimate_stale');
    expect((await post(own, { blocks, stale: 'mark' })).json()).toMatchObject({ stale: true });
    const row = CSV.split('\r\n').slice(0, 2).join('\n');
    expect((await post(own, row, {}, '?stale=mark')).json()).toMatchObject({ stale: true });
  });

  it('is described with both kinds of body and of answer', async () => {
    const { get } = await app();
    const document = (await get('/api/openapi.json')).json();
    const { post: described } = document.paths['/api/units/{unit}/schedule'];
    const { content } = described.requestBody;
    expect(Object.keys(content)).toEqual(['application/json', 'text/csv']);
    const body = content['application/json'].schema;
    expect(body.required).toEqual(['blocks']);
    expect(body.properties.blocks.items.required).toEqual(['mode', 'from', 'to']);
    expect(Object.keys(described.responses['200'].content)).toEqual([
      'application/json',
      'text/csv',
    ]);
  });

  it('answers 404 for a unit that there is not', async () => {
    const { app: own } = await app();
    const url = '/api/units/south/schedule';
    const answer = await own.inject({ method: 'POST', url, payload: { blocks: BLOCKS } });
    expect(answer.statusCode).toBe(404);
    expect(answer.json().error).toMatchObject({ code: 'unknown_unit', value: 'south' });
  });
});
