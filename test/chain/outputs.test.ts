import { readFileSync } from 'node:fs';
import { connectAsync } from 'mqtt';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { z } from 'zod';
import { headroomSchema } from '../../src/adapters/http/schema/plan.js';
import { ReadingPublisher } from '../../src/adapters/mqtt/readingPublisher.js';
import { loadSite } from '../../src/config/load.js';
import { COMMAND_CAUSES } from '../../src/core/plan/leg.js';
import { limitsView } from '../../src/core/plan/limitsView.js';
import { shortTable } from '../../src/core/plan/offerSummary.js';
import { createDemoPlant } from '../../src/plant/demoPlant.js';
import { RockhourProcess } from '../daemon/processes.js';
import { siteFile } from '../daemon/siteFile.js';
import { requireProgram } from '../support/requirements.js';
import { type Service, startMosquitto } from '../support/services.js';
import { waitFor } from '../support/wait.js';
import { answerSchema, faultsOf, type OpenApiDocument, operations } from './openApi.js';
import { contractLine } from './replayContract.js';

/**
 * What a running daemon tells: retained topics at a real broker, and the HTTP API against its own
 * OpenAPI document. The plant is the one of the demonstration, with a thermocouple that is cut off.
 */
const mosquitto = requireProgram('mosquitto');
const SCANS = 40;
const CUT = 'hot_axis_03';
const ALERT = `vellmoor/sensor_rejected/${CUT}`;

const HEADROOM = 'rockhour/vellmoor/headroom';
/** An answer of hours as the contract has it, and what limits its power. */
const limitedAnswer = contractLine.shape.dispatch
  .unwrap()
  .element.extend({ limited_by: z.enum(COMMAND_CAUSES).nullable() });

interface Heard {
  readonly content: Record<string, unknown>;
  readonly retain: boolean;
}

/**
 * What the broker has for a client that comes now: the first and the newest of each topic, with the
 * flag. The first is the one that was retained; a scan without readings may close meanwhile.
 */
async function listen(url: string): Promise<{
  first: Map<string, Heard>;
  heard: Map<string, Heard>;
  end: () => Promise<void>;
}> {
  const client = await connectAsync(url);
  const first = new Map<string, Heard>();
  const heard = new Map<string, Heard>();
  client.on('message', (topic, payload, packet) => {
    const content = JSON.parse(payload.toString()) as Record<string, unknown>;
    const message = { content, retain: packet.retain };
    if (!first.has(topic)) first.set(topic, message);
    heard.set(topic, message);
  });
  await client.subscribeAsync('rockhour/#');
  return { first, heard, end: () => client.endAsync(true) };
}

describe.skipIf(!mosquitto)('a running daemon', () => {
  let broker: Service;
  let daemon: RockhourProcess;
  let config: string;
  let page: string;
  let first_ms: number;

  async function startDaemon(): Promise<void> {
    daemon = new RockhourProcess(['run', '--config', config], true);
    [, page] = / page=(\S+)\//.exec(await daemon.ready())! as unknown as [string, string];
    await waitFor('the broker', () => daemon.stderr.includes('connected to the MQTT broker'));
  }

  beforeAll(async () => {
    broker = await startMosquitto(mosquitto!);
    config = siteFile({ mqtt: { url: broker.url, client_id: 'outputs-test' } }, 40).path;
    await startDaemon();
    const site = loadSite(config);
    const unit = site.units[0]!;
    const gateway = new ReadingPublisher(broker.url, site.sources);
    await gateway.start();
    const plant = createDemoPlant(unit);
    const steps = Array.from({ length: SCANS }, () => plant.step());
    // Fresh readings: the last one is of now.
    const shift_ms = Math.floor((Date.now() - steps.at(-1)!.time_ms) / 30_000) * 30_000;
    first_ms = steps[0]!.time_ms + shift_ms;
    for (const { time_ms, values } of steps) {
      await gateway.readings(unit.id, time_ms + shift_ms, { ...values, [CUT]: null });
    }
    await gateway.stop();
    await waitFor(
      'the last scan',
      async () => (await get('/api/counters')).body.counters.scans >= SCANS,
      30_000,
    );
  }, 90_000);

  afterAll(async () => {
    await daemon?.end('SIGKILL');
    await broker?.stop();
  });

  // biome-ignore lint/suspicious/noExplicitAny: what a client sees, unknown beforehand
  async function get(path: string): Promise<{ status: number; type: string; body: any }> {
    const answer = await fetch(`${page}${path}`);
    const type = (answer.headers.get('content-type') ?? '').split(';')[0]!;
    const body = type === 'application/json' ? await answer.json() : await answer.text();
    return { status: answer.status, type, body };
  }

  it('has said state, hours, headroom, alarms and heartbeat, retained, for whoever comes later', async () => {
    const { first, heard, end } = await listen(broker.url);
    const topics = ['rockhour/heartbeat', 'rockhour/vellmoor/alarms'];
    topics.push('rockhour/vellmoor/dispatch', 'rockhour/vellmoor/headroom');
    topics.push('rockhour/vellmoor/state', 'rockhour/vellmoor/watch');
    // What it can still take comes from the worker, some seconds after the first full hours.
    await waitFor('all topics', () => topics.every((topic) => heard.has(topic)), 20_000);
    expect([...heard.keys()].sort()).toEqual(topics);
    const of = (topic: string) => heard.get(topic)!.content;
    // Headroom may come while this listens.
    for (const topic of topics.filter((one) => one !== HEADROOM)) {
      expect(first.get(topic)!.retain, topic).toBe(true);
    }
    // The state is a line of the replay without its events; a scan may close between the two looks.
    const { state, now } = await waitFor('topic and page of one scan', async () => {
      const now = (await get('/api/units/vellmoor')).body;
      const state = contractLine.omit({ events: true }).strict().parse(of(topics[4]!));
      return state.time === now.estimate.time && { state, now };
    });
    expect(state.unit).toBe('vellmoor');
    expect(state.state_of_charge).toBe(now.estimate.state_of_charge);
    const dispatch = z
      .strictObject({ time: z.string(), unit: z.string(), answers: z.array(limitedAnswer) })
      .parse(of(topics[2]!));
    expect(dispatch.answers.map(({ power_MW }) => power_MW)).toEqual([1.8, 1.2]);
    expect(dispatch.answers).toEqual(now.dispatch.answers);
    // 3.6 MW is the greatest charging power of the configuration, 1.8 MW the rated one.
    const headroom = of(HEADROOM) as z.output<typeof headroomSchema>;
    const { age_s: _age, stale: _stale, ...told } = headroomSchema.shape;
    expect(z.strictObject(told).safeParse(headroom).error?.issues ?? []).toEqual([]);
    expect(headroom.answers.map(({ power_MW_el }) => power_MW_el)).toEqual([3.6, 1.8]);
    for (const { hours, energy_MWh_el, power_MW_el, refused } of headroom.answers) {
      expect(refused).toBeNull();
      expect(hours.p90).toBeLessThanOrEqual(hours.p10);
      // Start-up and ramp are in the energy, not in full power: never more than power times hours.
      expect(energy_MWh_el.p50).toBeLessThanOrEqual(power_MW_el * hours.p50 + 0.05);
    }
    // Told for the time of the estimate: the page's, of this moment, may stand beyond a change.
    const unit = loadSite(config).units[0]!;
    const told_for = (time: number) => JSON.parse(JSON.stringify(limitsView(unit, time)));
    expect(headroom.limits).toEqual(told_for(Date.parse(headroom.time)));
    const { connection: _now, outages: _ahead, ...fixed } = now.definition.limits;
    expect(headroom.limits).toMatchObject(fixed);
    const alarms = of(topics[1]!) as { standing: { id: string }[] };
    const keys = ['counts', 'last', 'left_out', 'standing', 'suppressed', 'time', 'unit'];
    expect(Object.keys(alarms).sort()).toEqual(keys);
    expect(alarms.standing.map(({ id }) => id)).toContain(ALERT);
    const beat = z
      .strictObject({
        status: z.literal('online'),
        time: z.iso.datetime(),
        site: z.string(),
        version: z.string(),
        uptime_s: z.int().min(0),
      })
      .parse(first.get(topics[0]!)!.content);
    expect(Math.abs(Date.parse(beat.time) - Date.now())).toBeLessThan(60_000);
    // It beats every 10 s, now as news.
    await waitFor('the next beat', () => !heard.get(topics[0]!)!.retain, 15_000);
    const next = of(topics[0]!) as { uptime_s: number };
    expect(next.uptime_s).toBeGreaterThan(beat.uptime_s);
    await end();
  }, 30_000);

  it('says the offer table that was kept last, without its blocks', async () => {
    const { heard, end } = await listen(broker.url);
    const topic = 'rockhour/vellmoor/offers';
    const path = '/api/units/vellmoor/offers?power_MW=1&horizon_h=1&block_min=60';
    expect((await get(path)).body.kept).toBeNull();
    const { kept, ...table } = (await get(`${path}&keep=true`)).body;
    await waitFor('the topic', () => heard.has(topic));
    const { no, asked, ...said } = heard.get(topic)!.content;
    expect(no).toBe(kept);
    expect(Math.abs(Date.parse(asked as string) - Date.now())).toBeLessThan(60_000);
    expect(said).toEqual(shortTable(table));
    await end();
  }, 30_000);

  describe('its OpenAPI document', () => {
    let document: OpenApiDocument;
    beforeAll(async () => {
      document = (await get('/api/openapi.json')).body as OpenApiDocument;
    });

    it('is valid, and says something about each answer', () => {
      expect(faultsOf(document)).toEqual([]);
    });

    it('has every route that README.md names', () => {
      const readme = readFileSync(new URL('../../README.md', import.meta.url), 'utf8');
      const named = [...readme.matchAll(/`(?:GET|POST)? ?(\/(?:api\/[\w/{}-]+|metrics))[`?]/g)];
      const routes = new Set(named.map(([, route]) => route!));
      routes.delete('/api/openapi.json');
      expect([...routes].sort()).toEqual(Object.keys(document.paths).sort());
    });

    /** Questions to each route that are answered, by path of the document. */
    const ASKED: Readonly<Record<string, readonly string[]>> = {
      '/api/health': [''],
      '/api/live': [''],
      '/api/ready': [''],
      '/api/login': [''],
      '/api/counters': [''],
      '/metrics': [''],
      '/api/units': [''],
      '/api/units/{unit}': [''],
      '/api/units/{unit}/profile': [''],
      '/api/units/{unit}/hours': ['?power_MW=1.8,1.2', '?power_MW=1'],
      '/api/units/{unit}/sensors': [''],
      '/api/units/{unit}/headroom': ['?power_MW=2'],
      '/api/units/{unit}/capability': [''],
      '/api/units/{unit}/balance': [''],
      '/api/units/{unit}/offers': ['?power_MW=1&horizon_h=1&block_min=60'],
      '/api/units/{unit}/offers/history': [''],
      '/api/units/{unit}/offers/history/{no}': [''],
      '/api/units/{unit}/offers/report': [''],
      '/api/units/{unit}/history': ['', '?points=5', '?series=state_of_charge', '?format=csv'],
      '/api/units/{unit}/watch': [''],
      '/api/units/{unit}/cycles': [''],
      '/api/units/{unit}/rewinds': [''],
      '/api/alarms': ['', '?unit=vellmoor'],
      '/api/events': ['', '?unit=vellmoor&most=3'],
      '/api/alarms/transitions': ['', '?unit=vellmoor&most=3'],
      '/api/alarms/figures': ['', '?unit=vellmoor'],
      '/api/units/{unit}/profiles': ['', '?sigma=no&points=2'],
      '/api/units/{unit}/watch/history': [''],
    };
    const later = (hours: number) => new Date(Date.now() + hours * 3.6e6).toISOString();
    const block = () => ({ mode: 'discharge', power_MW_el: 1, from: later(1), to: later(2) });
    /** What is posted and answered, and what is not, by path. */
    const POSTED: Readonly<Record<string, () => readonly [object, object]>> = {
      '/api/units/{unit}/offers': () => [
        { powers_MW_el: [1], gate: { closes_before_min: 60 }, block_min: 60, horizon_h: 1 },
        { powers_MW_el: [-1], gate: { closes_before_min: 60 } },
      ],
      '/api/units/{unit}/schedule': () => [{ blocks: [block()] }, { blocks: [block(), block()] }],
    };
    /** And such as are not. */
    const REFUSED = [
      ['/api/units/{unit}', '/api/units/nowhere', 404],
      ['/api/units/{unit}/hours', '/api/units/vellmoor/hours?power_MW=all', 400],
      ['/api/units/{unit}/sensors', '/api/units/vellmoor/sensors?over=week', 400],
      ['/api/units/{unit}/headroom', '/api/units/vellmoor/headroom?power_MW=-1', 400],
      ['/api/units/{unit}/offers/history/{no}', '/api/units/vellmoor/offers/history/99', 404],
      ['/api/units/{unit}/history', '/api/units/vellmoor/history?from=noon', 400],
      ['/api/alarms', '/api/alarms?unit=nowhere', 400],
      ['/api/stream', '/api/stream?profile=nowhere', 400],
    ] as const;

    it('makes a report in each of its forms', async () => {
      const path = '/api/units/vellmoor/report';
      const html = await get(path);
      expect([html.status, html.type]).toEqual([200, 'text/html']);
      expect(String(html.body)).toContain('<h2>Findings</h2>');
      const json = await get(`${path}?format=json`);
      expect(json.body).toMatchObject({ unit: 'vellmoor', findings: expect.any(Array) });
      const csv = await get(`${path}?format=csv&table=indicators`);
      expect(String(csv.body)).toMatch(/^indicator,subject,state/);
    });

    it('describes every answer to the last key', async () => {
      const rest = operations(document).filter(([path, way]) => way === 'get' && !(path in ASKED));
      // No JSON: asked below, read as a stream elsewhere, and a file (test/daemon/backup).
      expect(rest.map(([path]) => path).sort()).toEqual([
        '/api/stream',
        '/api/units/{unit}/backup',
        '/api/units/{unit}/report',
      ]);
      for (const [path, queries] of Object.entries(ASKED)) {
        const operation = document.paths[path]!.get!;
        for (const query of queries) {
          const { status, type, body } = await get(
            `${path.replace('{unit}', 'vellmoor').replace('{no}', '1')}${query}`,
          );
          expect(status, `${path}${query}`).toBe(200);
          const checked = answerSchema(operation, status, type).safeParse(body);
          expect(checked.error?.issues ?? [], `${path}${query}`).toEqual([]);
        }
      }
      const posts = operations(document).filter(
        ([path, way]) => way === 'post' && !(path in POSTED),
      );
      // Those about alarms are asked below, log-in and log-out where there are tokens.
      const elsewhere = /^\/api\/(alarms\/|login$|logout$)/;
      expect(posts.map(([path]) => path).filter((path) => !elsewhere.test(path))).toEqual([]);
      for (const [path, contents] of Object.entries(POSTED)) {
        for (const [i, content] of contents().entries()) {
          const answer = await fetch(`${page}${path.replace('{unit}', 'vellmoor')}`, {
            method: 'POST',
            headers: { 'content-type': 'application/json' },
            body: JSON.stringify(content),
          });
          expect(answer.status, `${path} ${i}`).toBe(i === 0 ? 200 : 400);
          const schema = answerSchema(
            document.paths[path]!.post!,
            answer.status,
            'application/json',
          );
          const checked = schema.safeParse(await answer.json());
          expect(checked.error?.issues ?? [], `${path} ${i}`).toEqual([]);
        }
      }
      for (const [path, question, expected] of REFUSED) {
        const { status, type, body } = await get(question);
        expect(status, question).toBe(expected);
        const checked = answerSchema(document.paths[path]!.get!, status, type).safeParse(body);
        expect(checked.error?.issues ?? [], question).toEqual([]);
      }
    }, 60_000);

    it('would notice an answer that differs from it', async () => {
      const schema = answerSchema(document.paths['/api/units']!.get!, 200, 'application/json');
      const { body } = await get('/api/units');
      expect(schema.safeParse(body).success).toBe(true);
      expect(schema.safeParse({ ...body, more: 1 }).success).toBe(false);
      const { site: _, ...less } = body;
      expect(schema.safeParse(less).success).toBe(false);
      expect(schema.safeParse({ ...body, site: 1 }).success).toBe(false);
    });

    it('describes what acknowledges an alert, and the stream', async () => {
      const say = async (content: object, action = 'acknowledge') => {
        const path = `/api/alarms/${action}`;
        const { post } = document.paths[path]!;
        const answer = await fetch(`${page}${path}`, {
          method: 'POST',
          headers: { 'content-type': 'application/json' },
          body: JSON.stringify(content),
        });
        const schema = answerSchema(post!, answer.status, 'application/json');
        const body: unknown = await answer.json();
        expect(schema.safeParse(body).error?.issues ?? []).toEqual([]);
        return { status: answer.status, body };
      };
      expect((await say({ id: ALERT, who: 'night shift' })).body).toMatchObject({
        acknowledged_by: 'night shift',
        standing: { id: ALERT, state: 'acknowledged' },
      });
      const why = { id: ALERT, who: 'day shift', why: 'being mended' };
      const steps = [
        ['shelve', { ...why, hours: 2 }, 'shelved'],
        ['unshelve', { id: ALERT, who: 'day shift' }, 'unacknowledged'],
        ['out-of-service', why, 'out_of_service'],
        ['return-to-service', why, 'unacknowledged'],
      ] as const;
      for (const [action, content, state] of steps) {
        expect((await say(content, action)).body).toMatchObject({ id: ALERT, state });
      }
      expect((await say({ id: ALERT, who: 'x' }, 'reset')).status).toBe(409);
      expect((await say({ ...why, hours: 9 }, 'shelve')).status).toBe(400);
      expect((await say({ id: 'vellmoor/none', who: 'x' })).status).toBe(404);
      expect((await say({ who: 'x' })).status).toBe(400);
      const stream = document.paths['/api/stream']!.get!.responses['200']!;
      expect(Object.keys(stream.content!)).toEqual(['text/event-stream']);
      const answer = await fetch(`${page}/api/stream`);
      expect(answer.headers.get('content-type')).toMatch(/^text\/event-stream/);
      await answer.body!.cancel();
    });
  });

  it('is well in each part while readings come, and gives the history that it has stored', async () => {
    const health = await get('/api/health');
    expect(health.body.parts.map(({ name }: { name: string }) => name)).toEqual([
      'mqtt',
      'store',
      'clock',
      'unit vellmoor',
    ]);
    expect(health.body.ok).toBe(true);
    const { rows } = (await get('/api/units/vellmoor/history?points=5000')).body;
    expect(rows).toHaveLength(SCANS);
    expect(Math.abs(Date.parse(rows[0].time) - first_ms)).toBeLessThan(30_000);
  });

  it('says good-bye, and its last will says it where it could not', async () => {
    const { heard, end } = await listen(broker.url);
    const status = () => heard.get('rockhour/heartbeat')?.content.status;
    await waitFor('online', () => status() === 'online');
    expect(await daemon.end('SIGTERM')).toBe(0);
    await waitFor('the farewell', () => status() === 'offline');
    await startDaemon();
    await waitFor('online again', () => status() === 'online');
    await daemon.end('SIGKILL');
    await waitFor('the last will', () => status() === 'offline');
    await end();
    // Whoever comes now sees at once that it is gone, and the last state with its time.
    const later = await listen(broker.url);
    await waitFor('the state', () => later.heard.has('rockhour/vellmoor/state'));
    await waitFor(
      'offline',
      () => later.heard.get('rockhour/heartbeat')?.content.status === 'offline',
    );
    await later.end();
  }, 60_000);
});
