import { connect } from 'node:net';
import { pino } from 'pino';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { streamStateSchema } from '../../../src/adapters/http/schema/answers.js';
import { createHttpServer, type HttpServer } from '../../../src/adapters/http/server.js';
import type { HttpTuning } from '../../../src/adapters/http/tuning.js';
import { temporaryFolder } from '../../support/folders.js';
import { waitFor } from '../../support/wait.js';
import { COLD, HOT, unitOf } from './scriptedDefinitions.js';
import { ScriptedPlant } from './scriptedPlant.js';
import { readStream } from './sseReader.js';

const TUNING: Partial<HttpTuning> = { heartbeat_ms: 60_000, state_every_ms: 5 };
let server: HttpServer;
let plant: ScriptedPlant;
let url: string;

async function serve(tuning: Partial<HttpTuning> = {}): Promise<void> {
  server = createHttpServer(
    plant,
    { host: '127.0.0.1', port: 0, path_prefix: '' },
    {
      log: pino({ level: 'silent' }),
      pageFolder: temporaryFolder('page'),
      tuning: { ...TUNING, ...tuning },
    },
  );
  ({ url } = await server.start());
}

beforeEach(() => {
  plant = new ScriptedPlant([
    unitOf('north', 'North unit', [HOT, COLD]),
    unitOf('south', 'South', [HOT]),
  ]);
});
afterEach(() => server.stop());

const stream = (query = '', headers: Record<string, string> = {}) =>
  readStream(`${url}api/stream${query}`, headers);

describe('the live stream', () => {
  it('greets, then sends the state of every unit and a beat', async () => {
    await serve();
    const client = stream();
    await waitFor('the first beat', () => client.of('beat').length > 0);
    expect(client.state.status).toBe(200);
    expect(client.state.headers).toMatchObject({
      'content-type': 'text/event-stream',
      'x-accel-buffering': 'no',
    });
    expect(client.messages.map((message) => message.event)).toEqual([
      'hello',
      'state',
      'state',
      'beat',
    ]);
    expect(client.messages[0]!.data).toMatchObject({ units: ['north', 'south'], resume: 'new' });
    expect(client.messages[0]!.id).toMatch(/^[0-9a-f]{8}-0$/);
    const state = streamStateSchema.strict().parse(client.messages[1]!.data);
    expect([state.unit, state.profile]).toEqual(['north', null]);
    client.close();
  });

  it('sends the profile of the unit asked for and of no other', async () => {
    await serve();
    const client = stream('?profile=south');
    await waitFor('both states', () => client.of('state').length === 2);
    const [north, south] = client.of('state').map((one) => streamStateSchema.parse(one.data));
    expect(north!.profile).toBeNull();
    expect(south!.profile!.stores.hot!.readings).toHaveLength(42);
    client.close();
  });

  it('sends the newest state of many in quick succession', async () => {
    await serve({ state_every_ms: 200 });
    const client = stream();
    await waitFor('the first beat', () => client.of('beat').length > 0);
    for (let i = 0; i < 50; i++) plant.step();
    const newest = plant.time();
    await waitFor('the newest state', () =>
      client.of('state').some((one) => (one.data.estimate as { time: string }).time === newest),
    );
    // Two units, greeted once; 50 steps within one period make at most two flushes.
    expect(client.of('state').length).toBeLessThanOrEqual(2 + 2 * 2);
    client.close();
  });

  it('gives a client that comes back exactly the events it missed, in order', async () => {
    await serve();
    const first = stream();
    await waitFor('the greeting', () => first.of('hello').length > 0);
    plant.raise({ kind: 'front_spread', subject: 'a' });
    await waitFor('the first event', () => first.of('event').length === 1);
    const lastId = first.of('event')[0]!.id!;
    first.close();
    for (const subject of ['b', 'c', 'd']) plant.raise({ kind: 'front_spread', subject });

    const back = stream('', { 'last-event-id': lastId });
    await waitFor('the beat', () => back.of('beat').length > 0);
    expect(back.of('hello')[0]!.data.resume).toBe('resumed');
    expect(back.of('event').map((one) => one.data.subject)).toEqual(['b', 'c', 'd']);
    plant.raise({ kind: 'front_spread', subject: 'e' });
    await waitFor('the live event', () => back.of('event').length === 4);
    const ids = back.of('event').map((one) => Number(one.id!.split('-')[1]));
    expect(ids).toEqual([2, 3, 4, 5]);
    back.close();
  });

  it('resumes from the greeting alone, by query where a header cannot be set', async () => {
    await serve();
    const first = stream();
    await waitFor('the greeting', () => first.of('hello').length > 0);
    first.close();
    plant.raise({ kind: 'data_stale', subject: 'north' });
    const back = stream(`?last_event_id=${first.of('hello')[0]!.id}`);
    await waitFor('the event', () => back.of('event').length === 1);
    back.close();
  });

  it('tells of a gap where the events are no longer kept, or the id is of another run', async () => {
    await serve({ events_kept: 2 });
    const first = stream();
    await waitFor('the greeting', () => first.of('hello').length > 0);
    const run = first.of('hello')[0]!.id!.split('-')[0]!;
    for (const subject of ['a', 'b', 'c']) plant.raise({ kind: 'front_spread', subject });
    await waitFor('the events', () => first.of('event').length === 3);
    first.close();
    const cases = [
      [`${run}-0`, 'gap', 0],
      [`${run}-1`, 'resumed', 2],
      [`${run}-3`, 'resumed', 0],
      [`${run}-4`, 'gap', 0],
      ['00000000-1', 'gap', 0],
      ['nonsense', 'gap', 0],
    ] as const;
    for (const [id, resume, events] of cases) {
      const back = stream('', { 'last-event-id': id });
      await waitFor('the beat', () => back.of('beat').length > 0);
      expect([id, back.of('hello')[0]!.data.resume, back.of('event').length]).toEqual([
        id,
        resume,
        events,
      ]);
      back.close();
    }
  });

  it('gives one that was away for long all it missed at once, more than may wait for a slow one', async () => {
    await serve({ waiting_most: 10 });
    const first = stream();
    await waitFor('the greeting', () => first.of('hello').length > 0);
    first.close();
    for (let i = 0; i < 50; i++) plant.raise({ kind: 'sensor_rejected', subject: String(i) });
    const back = stream('', { 'last-event-id': first.of('hello')[0]!.id! });
    await waitFor('the beat', () => back.of('beat').length > 0);
    expect(back.of('event')).toHaveLength(50);
    back.close();
  });

  it('sends a storm of events as some of them and the number of the rest, and cuts nobody off', async () => {
    await serve();
    const client = stream();
    await waitFor('hello', () => client.of('hello').length === 1);
    for (let n = 0; n < 10_000; n++) plant.raise({ kind: 'sensor_rejected', subject: `t${n}` });
    const leftOut = () =>
      client
        .of('alarms')
        .reduce((sum, { data }) => sum + ((data as { left_out?: number }).left_out ?? 0), 0);
    await waitFor('all are told', () => client.of('event').length + leftOut() === 10_000);
    expect(client.of('event').length).toBeLessThanOrEqual(300);
    expect(client.of('alarms').length).toBeLessThan(1000);
    expect(client.of('hello')).toHaveLength(1);
    // Once it is over each event is sent again.
    await new Promise((resolve) => setTimeout(resolve, 1100));
    const before = client.of('event').length;
    plant.raise({ kind: 'front_spread', subject: 'hot' });
    await waitFor('the next', () => client.of('event').length === before + 1);
  });

  it('tells every client when one has acknowledged', async () => {
    await serve();
    const client = stream();
    const { id } = plant.raise({ kind: 'front_spread', subject: 'hot' });
    await waitFor('the beat', () => client.of('beat').length > 0);
    expect(client.of('alarms')).toHaveLength(0);
    await fetch(`${url}api/alarms/acknowledge`, {
      method: 'POST',
      headers: { 'content-type': 'application/json' },
      body: JSON.stringify({ id, who: 'day shift' }),
    });
    await waitFor('the news', () => client.of('alarms').length === 1);
    client.close();
  });

  it('beats with the age of the readings', async () => {
    plant.age_s = 42;
    plant.stale = true;
    await serve({ heartbeat_ms: 20 });
    const client = stream();
    await waitFor('three beats', () => client.of('beat').length >= 3);
    expect(client.of('beat')[2]!.data).toEqual({
      units: [
        { unit: 'north', age_s: 42, stale: true },
        { unit: 'south', age_s: 42, stale: true },
      ],
    });
    client.close();
  });

  it('cuts off a client that takes nothing, without keeping its messages', async () => {
    await serve({ heartbeat_ms: 30, state_every_ms: 1 });
    const { hostname, port } = new URL(url);
    const socket = connect(Number(port), hostname);
    let closed = false;
    socket.on('close', () => {
      closed = true;
    });
    socket.on('error', () => undefined);
    socket.write(
      'GET /api/stream?profile=north HTTP/1.1\r\nHost: 127.0.0.1\r\nAccept: text/event-stream\r\n\r\n',
    );
    socket.pause();
    const metric = () => fetch(`${url}api/counters`).then((answer) => answer.json());
    await waitFor(
      'the client to be cut off',
      async () => {
        for (let i = 0; i < 40; i++) plant.step(0);
        return (await metric()).counters.http_slow_streams_ended === 1;
      },
      20_000,
      5,
    );
    socket.resume();
    await waitFor('the socket to close', () => closed);
  }, 30_000);

  it('refuses more streams than it serves, and takes one again after another has gone', async () => {
    await serve({ streams_most: 1 });
    const one = stream();
    await waitFor('the greeting', () => one.of('hello').length > 0);
    const refused = await fetch(`${url}api/stream`);
    expect(refused.status).toBe(503);
    expect((await refused.json()).error.code).toBe('too_many_streams');
    one.close();
    await waitFor('a place', async () => {
      const next = await fetch(`${url}api/stream`);
      await next.body?.cancel();
      return next.status === 200;
    });
  });

  it('refuses a client that takes no event stream', async () => {
    await serve();
    for (const accept of ['application/json', 'text/event-stream;q=0, application/json']) {
      const answer = await fetch(`${url}api/stream`, { headers: { accept } });
      expect(answer.status).toBe(406);
      expect((await answer.json()).error).toMatchObject({
        code: 'not_acceptable',
        field: 'Accept',
      });
    }
  });
});

describe('the server', () => {
  it('ends open streams when it stops, lets go of the service, and may be stopped twice', async () => {
    await serve();
    const client = stream();
    await waitFor('the greeting', () => client.of('hello').length > 0);
    expect(plant.listening).toBe(1);
    await server.stop();
    await server.stop();
    await waitFor('the end of the stream', () => client.state.ended);
    expect(plant.listening).toBe(0);
    await expect(fetch(url)).rejects.toThrow();
  });

  it('gives one clear error of the catalogue where its port is taken', async () => {
    await serve();
    const port = Number(new URL(url).port);
    const second = createHttpServer(
      plant,
      { host: '127.0.0.1', port, path_prefix: '' },
      { log: pino({ level: 'silent' }), pageFolder: temporaryFolder('page') },
    );
    await expect(second.start()).rejects.toMatchObject({
      code: 'PORT_IN_USE',
      message: `cannot listen for HTTP on 127.0.0.1:${port} (http.host, http.port): another program listens there`,
    });
    await second.stop();
    expect(plant.listening).toBe(1);
  });
});
