import { afterEach, describe, expect, it } from 'vitest';
import { faultSchema } from '../../../src/adapters/http/schema/answers.js';
import { testApp } from './httpApp.js';

type Built = Awaited<ReturnType<typeof testApp>>;
let built: Built | null = null;

async function app(options?: Parameters<typeof testApp>[0]): Promise<Built> {
  built = await testApp(options);
  return built;
}

afterEach(async () => {
  await built?.app.close();
  built = null;
});

const POWERS = /^1 to 8 powers in MW, each above 0 and at most 10000/;

describe('a wrong question', () => {
  const hours = '/api/units/north/hours';
  const history = '/api/units/north/history';

  it.each([
    ['/api/units/north/sensors?over=week', 'over', 'week', 'now or day'],
    [hours, 'power_MW', null, POWERS],
    [`${hours}?power_MW=`, 'power_MW', '', POWERS],
    [`${hours}?power_MW=two`, 'power_MW', 'two', POWERS],
    [`${hours}?power_MW=0`, 'power_MW', '0', POWERS],
    [`${hours}?power_MW=-1`, 'power_MW', '-1', POWERS],
    [`${hours}?power_MW=1,NaN`, 'power_MW', '1,NaN', POWERS],
    [`${hours}?power_MW=1,,2`, 'power_MW', '1,,2', POWERS],
    [`${hours}?power_MW=0x10`, 'power_MW', '0x10', POWERS],
    [`${hours}?power_MW=1e999`, 'power_MW', '1e999', POWERS],
    [`${hours}?power_MW=1,2,3,4,5,6,7,8,9`, 'power_MW', '1,2,3,4,5,6,7,8,9', POWERS],
    [`${hours}?power_MW=1&power_MW=2`, 'power_MW', ['1', '2'], POWERS],
    [`${history}?from=yesterday`, 'from', 'yesterday', /ISO 8601 with offset/],
    [`${history}?from=2026-01-31`, 'from', '2026-01-31', /ISO 8601 with offset/],
    [`${history}?to=2026-02-30T00:00:00Z`, 'to', '2026-02-30T00:00:00Z', /ISO 8601 with offset/],
    [`${history}?points=0`, 'points', '0', /whole number from 1 to 5000/],
    [`${history}?points=5001`, 'points', '5001', /whole number from 1 to 5000/],
    [`${history}?points=1.5`, 'points', '1.5', /whole number from 1 to 5000/],
    [`${history}?format=xml`, 'format', 'xml', /^json or csv$/],
    ['/api/events?most=1001', 'most', '1001', /whole number from 1 to 1000/],
  ])(
    '%s is answered with field, value and what was expected',
    async (url, field, value, expected) => {
      const { get, logged } = await app();
      const answer = await get(url);
      expect(answer.statusCode).toBe(400);
      const { error } = faultSchema.strict().parse(answer.json());
      expect(error).toMatchObject({ code: 'wrong_value', field, value });
      expect(error.expected).toMatch(expected);
      expect(error.message).toContain(field);
      expect(error.message).toContain(error.expected!);
      expect(logged).toEqual([]);
    },
  );

  it('names an unknown key and those that are known', async () => {
    const { get } = await app();
    const answer = await get(`${hours}?powr_MW=1`);
    expect(answer.statusCode).toBe(400);
    const { error } = answer.json();
    // The missing power is a fault of its own.
    const all = [error, ...error.others];
    expect(all.map((one) => one.field).sort()).toEqual(['power_MW', 'powr_MW']);
    const unknown = (await get('/api/alarms?units=north')).json().error;
    expect(unknown).toMatchObject({
      code: 'unknown_field',
      field: 'units',
      value: 'north',
      expected: 'only unit',
    });
  });

  it('about the order of a span says what "to" is', async () => {
    const { get } = await app();
    const { error } = (
      await get(`${history}?from=2026-01-31T05:00:00Z&to=2026-01-31T04:00:00Z`)
    ).json();
    expect(error).toMatchObject({ code: 'wrong_value', field: 'from' });
    expect(error.expected).toBe('a time before "to", which is 2026-01-31T04:00:00.000Z');
  });

  it.each(['', '/profile', '/hours?power_MW=1', '/sensors', '/history'])(
    'about an unknown unit%s says which there are',
    async (rest) => {
      const { get } = await app();
      const answer = await get(`/api/units/south${rest}`);
      expect(answer.statusCode).toBe(404);
      expect(answer.json().error).toMatchObject({
        code: 'unknown_unit',
        field: 'unit',
        value: 'south',
        expected: 'one of north',
      });
    },
  );

  it.each(['/api/alarms?unit=south', '/api/events?unit=south', '/api/stream?profile=south'])(
    '%s says which units there are',
    async (url) => {
      const { get } = await app();
      const answer = await get(url);
      expect(answer.statusCode).toBe(400);
      expect(answer.json().error).toMatchObject({ code: 'unknown_unit', expected: 'one of north' });
    },
  );

  it('about an unknown series says which there are', async () => {
    const { get } = await app();
    const answer = await get(`${history}?series=hours_p50_at_2_MW,warmth`);
    expect(answer.statusCode).toBe(400);
    expect(answer.json().error).toMatchObject({ code: 'unknown_series', value: 'warmth' });
    expect(answer.json().error.expected).toContain('state_of_charge');
  });

  it('at an unknown route is answered as JSON', async () => {
    const { get } = await app();
    for (const url of ['/api/unit', '/nothing', '/../secret']) {
      const answer = await get(url);
      expect(answer.statusCode).toBe(404);
      expect(faultSchema.strict().parse(answer.json()).error.code).toBe('unknown_route');
    }
  });
});

describe('a wrong acknowledgement', () => {
  async function post(payload: unknown, headers: Record<string, string> = {}) {
    const { app: server, plant } = await app();
    const raised = plant.raise({ kind: 'front_spread', subject: 'hot' });
    const answer = await server.inject({
      method: 'POST',
      url: '/api/alarms/acknowledge',
      payload: payload as string,
      headers,
    });
    expect(plant.acknowledged).toEqual([]);
    return { answer, error: answer.json().error, raised };
  }

  it.each([
    [{ who: 'me' }, 'id'],
    [{ id: 'x' }, 'who'],
    [{ id: 'x', who: '  ' }, 'who'],
    [{ id: 'x', who: 'a\nb' }, 'who'],
    [{ id: 'x', who: 'n'.repeat(65) }, 'who'],
    [{ id: 7, who: 'me' }, 'id'],
    [[], 'body'],
  ])('%j is answered with the field %s', async (payload, field) => {
    const { answer, error } = await post(payload);
    expect(answer.statusCode).toBe(400);
    expect(error).toMatchObject({ code: 'wrong_value', field });
    expect(error.expected).toBeTruthy();
  });

  it('of something that does not stand lists what does', async () => {
    const { answer, error, raised } = await post({ id: 'north/nothing', who: 'me' });
    expect(answer.statusCode).toBe(404);
    expect(error).toMatchObject({ code: 'unknown_event', field: 'id', value: 'north/nothing' });
    expect(error.expected).toContain(raised.id);
  });

  it('that is not JSON is answered as JSON', async () => {
    const broken = await post('{"id": ', { 'content-type': 'application/json' });
    expect(broken.answer.statusCode).toBe(400);
    expect(broken.error.code).toBe('unreadable_body');
    await built?.app.close();
    // A form of another site can send text/plain without asking first; JSON it cannot.
    const text = await post('{"id":"a","who":"b"}', { 'content-type': 'text/plain' });
    expect(text.answer.statusCode).toBe(415);
    expect(text.error).toMatchObject({
      ...{ code: 'unreadable_body', field: 'content-type', value: 'text/plain' },
      expected: 'content-type application/json',
    });
  });
});

describe('a question that cannot be answered now', () => {
  it('before the first scan says that there is no estimate yet', async () => {
    const { get, plant, logged } = await app();
    plant.started = false;
    for (const path of ['hours?power_MW=1', 'profile', 'sensors']) {
      const answer = await get(`/api/units/north/${path}`);
      expect(answer.statusCode).toBe(503);
      expect(answer.json().error).toMatchObject({ code: 'no_estimate_yet', value: 'north' });
    }
    expect(logged).toEqual([]);
  });

  it('because the computation failed says so, and logs the cause', async () => {
    const { get, plant, logged } = await app();
    plant.failHours = new Error('the worker has ended');
    const answer = await get('/api/units/north/hours?power_MW=2');
    expect(answer.statusCode).toBe(503);
    expect(answer.json().error).toMatchObject({ code: 'question_failed', field: 'power_MW' });
    expect(answer.json().error.message).toContain('the worker has ended');
    expect(logged.join()).toContain('the worker has ended');
    const worth = await get('/api/units/north/sensors?over=day');
    expect(worth.statusCode).toBe(503);
    expect(worth.json().error).toMatchObject({
      code: 'question_failed',
      field: 'over',
      value: 'day',
    });
    expect(worth.json().error.message).toContain('the worker has ended');
  });

  it('because no store has had readings says so', async () => {
    const { get, plant } = await app();
    plant.started = false;
    const worth = await get('/api/units/north/sensors?over=day');
    expect(worth.statusCode).toBe(503);
    expect(worth.json().error.message).toContain('not every store has had readings yet');
  });

  it('because of a fault of the daemon tells the client no more than where to look', async () => {
    const { get, plant, logged } = await app();
    plant.standing = () => {
      throw new Error('secret detail');
    };
    const answer = await get('/api/alarms');
    expect(answer.statusCode).toBe(500);
    expect(answer.json().error.code).toBe('internal');
    expect(answer.body).not.toContain('secret detail');
    expect(logged.join()).toContain('secret detail');
  });
});

describe('too many questions', () => {
  it('are answered with 429 in the same form, while health and metrics go on answering', async () => {
    const { get } = await app({ tuning: { questions_per_min: 3, hours_per_min: 1 } });
    expect((await get('/api/units/north/hours?power_MW=1')).statusCode).toBe(200);
    const second = await get('/api/units/north/hours?power_MW=1');
    expect(second.statusCode).toBe(429);
    expect(faultSchema.strict().parse(second.json()).error.code).toBe('too_many_requests');
    const codes = [];
    for (let i = 0; i < 5; i++) codes.push((await get('/api/units')).statusCode);
    expect(codes).toContain(200);
    expect(codes.at(-1)).toBe(429);
    expect((await get('/api/health')).statusCode).toBe(200);
    expect((await get('/metrics')).statusCode).toBe(200);
  });
});

it('says in JSON that the page has not been built', async () => {
  const { createHttpApp } = await import('../../../src/adapters/http/app.js');
  const { pino } = await import('pino');
  const { ScriptedPlant } = await import('./scriptedPlant.js');
  const { app: server } = await createHttpApp(new ScriptedPlant(), '', {
    log: pino({ level: 'silent' }),
    pageFolder: '/nowhere/at/all',
  });
  const answer = await server.inject({ method: 'GET', url: '/' });
  expect(answer.statusCode).toBe(503);
  expect(answer.json().error.code).toBe('page_not_built');
  await server.close();
});
