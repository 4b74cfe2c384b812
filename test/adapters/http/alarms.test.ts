import { afterEach, describe, expect, it } from 'vitest';
import {
  alarmsSchema,
  commandedSchema,
  figuresSchema,
  transitionsSchema,
} from '../../../src/adapters/http/schema/alarms.js';
import { ALARM_TEXTS } from '../../../src/core/watch/alarmTexts.js';
import { RockhourError } from '../../../src/errors.js';
import { testApp } from './httpApp.js';

type App = Awaited<ReturnType<typeof testApp>>;
const open: App[] = [];
afterEach(async () => {
  for (const { app, stream } of open.splice(0)) {
    stream.stop();
    await app.close();
  }
});

async function alarmed() {
  const made = await testApp();
  open.push(made);
  const { id } = made.plant.raise({
    ...{ kind: 'outlet_near_limit', subject: 'hot', class: 'alarm', priority: 'high' },
  });
  const post = async (action: string, payload: object) => {
    const answer = await made.app.inject({ method: 'POST', url: `/api/alarms/${action}`, payload });
    return { status: answer.statusCode, body: answer.json() };
  };
  const lists = async () => alarmsSchema.strict().parse((await made.get('/api/alarms')).json());
  return { ...made, id, post, lists };
}

const WORD = { who: 'night shift', why: 'sensor in the workshop' };

describe('alarms over HTTP', () => {
  it('are listed with state, letter and what to do, the shown apart from the held back', async () => {
    const { id, lists, post } = await alarmed();
    const { standing, suppressed, counts } = await lists();
    expect(standing).toMatchObject([
      { id, state: 'unacknowledged', letter: 'B', active: true, ...ALARM_TEXTS.outlet_near_limit },
    ]);
    expect([suppressed, counts]).toEqual([[], { unacknowledged: 1 }]);
    const { status, body } = await post('shelve', { id, ...WORD, hours: 2.5 });
    expect([status, commandedSchema.strict().parse(body)]).toMatchObject([
      200,
      { id, action: 'shelve', who: 'night shift', state: 'shelved' },
    ]);
    const after = await lists();
    expect(after).toMatchObject({ standing: [], counts: { shelved: 1 } });
    expect(after.suppressed[0]!.shelved).toMatchObject({ by: 'night shift', why: WORD.why });
  });

  it('are shown, taken out of service and back, each by a name, and leave a record of it', async () => {
    const { id, post, get } = await alarmed();
    const steps = [
      ['shelve', { id, ...WORD, hours: 1 }, 'shelved'],
      ['unshelve', { id, who: 'a' }, 'unacknowledged'],
      ['out-of-service', { id, ...WORD }, 'out_of_service'],
      ['return-to-service', { id, who: 'a' }, 'unacknowledged'],
      ['acknowledge', { id, who: 'a' }, 'acknowledged'],
    ] as const;
    for (const [action, body, state] of steps)
      expect(await post(action, body)).toMatchObject({ status: 200, body: { state } });
    const answer = await get('/api/alarms/transitions');
    const { transitions } = transitionsSchema.strict().parse(answer.json());
    expect(transitions.map(({ what }) => what)).toEqual([
      ...['shelved', 'unshelved', 'out_of_service', 'returned_to_service', 'acknowledged'],
    ]);
  });

  it.each([
    ['shelve', { ...WORD, hours: 9 }, 400, 'hours', /a number from 1\/60 \(a minute\) to 8/],
    ['shelve', { ...WORD, hours: -1 }, 400, 'hours', /a minute/],
    ['shelve', { who: 'a', hours: 1 }, 400, 'why', /the reason/],
    ['out-of-service', { why: 'x' }, 400, 'who', /a name of 1 to 64/],
    ['unshelve', { who: 'a' }, 409, 'action', /it is not shelved/],
    ['return-to-service', { who: 'a' }, 409, 'action', /not out of service/],
    ['reset', { who: 'a' }, 409, 'action', /its condition still stands/],
  ])('refuse to %s with %j: %d, field %s', async (action, body, status, field, expected) => {
    const { id, post } = await alarmed();
    const answer = await post(action, { id, ...body });
    expect(answer.status).toBe(status);
    expect(answer.body.error).toMatchObject({
      code: status === 409 ? 'wrong_state' : 'wrong_value',
      field,
      expected: expect.stringMatching(expected),
    });
  });

  it('name those there are where none has the id', async () => {
    const { id, post } = await alarmed();
    const answer = await post('unshelve', { id: 'north/none/hot', who: 'a' });
    expect(answer).toMatchObject({
      status: 404,
      body: { error: { code: 'unknown_event', field: 'id', expected: `one of ${id}` } },
    });
  });

  it('say that nothing was recorded where the disk does not take it', async () => {
    const { id, post, plant } = await alarmed();
    plant.commandAlarm = () => {
      throw new RockhourError('STORE_FAILED', 'the disk is full');
    };
    expect(await post('acknowledge', { id, who: 'a' })).toMatchObject({
      status: 503,
      body: { error: { code: 'question_failed', message: 'not recorded: the disk is full' } },
    });
  });

  it('have figures over a span, a day unless asked otherwise', async () => {
    const { id, get } = await alarmed();
    const figures = figuresSchema.strict().parse((await get('/api/alarms/figures')).json());
    expect(figures).toMatchObject({
      ...{ unit: null, annunciated: 1, per_day: 1, floods: [], most_in_10_min: 1 },
      most_frequent: [{ id, count: 1, share: 1 }],
      held_back: { shelved: 0, suppressed_by_design: 0, out_of_service: 0 },
    });
    const early = await get('/api/alarms/figures?to=2026-01-01T00:00:00Z&unit=north');
    expect(early.json()).toMatchObject({ unit: 'north', annunciated: 0, by_priority: null });
    const wrong = await get('/api/alarms/figures?from=2027-01-01T00:00:00Z');
    expect([wrong.statusCode, wrong.json().error.field]).toEqual([400, 'from']);
  });
});
