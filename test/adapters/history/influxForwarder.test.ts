import { createServer, type IncomingMessage, type RequestListener, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import { join } from 'node:path';
import { afterEach, describe, expect, it } from 'vitest';
import { History } from '../../../src/adapters/history/history.js';
import { InfluxForwarder } from '../../../src/adapters/history/influxForwarder.js';
import type { StoreConfig } from '../../../src/config/site.js';
import { temporaryFolder } from '../../support/folders.js';
import { freePort } from '../../support/ports.js';
import { requireProgram } from '../../support/requirements.js';
import { startInflux } from '../../support/services.js';
import { waitFor } from '../../support/wait.js';
import { estimate, event, NOTHING, unit } from './unit.js';

const influxd = requireProgram('influxd');
const T = Date.UTC(2026, 0, 1);
const STORE = { keep_estimates_days: 1e6, thin_after_days: 1e6, thin_to_s: 600 } as StoreConfig;

const ending: (() => unknown)[] = [];
afterEach(async () => {
  for (const end of ending.splice(0).reverse()) await end();
});

function setUp(url: string, batch_points = 5000) {
  const history = new History(join(temporaryFolder('influx'), 'history.sqlite'), STORE);
  history.start();
  const counts: Record<string, number> = {};
  const told: string[] = [];
  const make = () => {
    const forwarder = new InfluxForwarder({
      config: { url, database: 'rock', username: null, password: null, batch_points },
      outbox: () => history.outbox,
      count: (name, by) => {
        counts[name] = (counts[name] ?? 0) + by;
      },
      down: (reason) => told.push(`down: ${reason}`),
      up: () => told.push('up'),
      refused: (reason) => told.push(`refused: ${reason}`),
    });
    ending.push(() => forwarder.stop());
    forwarder.start();
    return forwarder;
  };
  ending.push(() => history.stop());
  return { history, counts, told, make };
}

function fill(history: History, from: number, to: number): void {
  history.write(() => {
    for (let i = from; i < to; i++) {
      history.estimates.add(unit, estimate(T + i * 30_000, i / 1000), NOTHING);
    }
  });
}

async function select(url: string, query: string): Promise<unknown[][]> {
  const answer = await fetch(`${url}/query?db=rock&epoch=ms&q=${encodeURIComponent(query)}`);
  const body = (await answer.json()) as { results: { series?: { values: unknown[][] }[] }[] };
  return body.results[0]?.series?.[0]?.values ?? [];
}

describe.skipIf(!influxd)('the forwarder, against a real InfluxDB', () => {
  it('deletes what a rewind has made void, and writes what holds there', async () => {
    const influx = await startInflux(influxd!);
    ending.push(() => influx.stop());
    const { history, counts, told, make } = setUp(influx.url);
    // Nothing to be deleted yet, and no database.
    history.rewinds.withdraw('u', T, T + 1);
    fill(history, 0, 4);
    history.events.add(event(T + 60_000, 'raised'));
    make();
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    history.write(() => {
      const past = history.past(unit, T + 30_000);
      for (const i of [1, 2]) {
        const again = estimate(T + i * 30_000 + 5, i / 10);
        again.stores.hot!.fronts = [];
        past.enter(
          { estimate: again, measured: NOTHING, profile: null },
          T + (i + 1) * 30_000,
          T + 90_000,
        );
      }
      past.end();
    });
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    const units = await select(influx.url, 'SELECT state_of_charge, revision FROM rockhour_unit');
    expect(units).toEqual([
      [T, 0, 0],
      [T + 30_005, 0.1, 1],
      [T + 60_005, 0.2, 1],
    ]);
    // A front that is not there any more leaves no point; events stay, as they were told.
    expect(await select(influx.url, 'SELECT position_m FROM rockhour_front')).toEqual([[T, 3]]);
    expect(await select(influx.url, 'SELECT value FROM rockhour_event')).toHaveLength(1);
    expect(told).toEqual([]);
    expect(counts.influx_set_aside).toBeUndefined();
  });

  it('creates the database and writes estimates, answers and events as documented', async () => {
    const influx = await startInflux(influxd!);
    ending.push(() => influx.stop());
    const { history, counts, told, make } = setUp(influx.url);
    const dispatch = [
      {
        power_MW: 1.8,
        hours: { p90: 1, p50: 2, p10: 3 },
        energy_MWh_el: { p90: 1.8, p50: 3.6, p10: 5.4 },
        ends_by: 'hot_outlet' as const,
      },
    ];
    history.estimates.add(unit, estimate(T, 0.5, { dispatch }), NOTHING);
    history.events.add(event(T + 5, 'raised'));
    make();
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    expect(told).toEqual([]);
    expect(counts).toEqual({ influx_points: 6 });
    expect(await select(influx.url, 'select state_of_charge, mode from rockhour_unit')).toEqual([
      [T, 0.5, 'charge'],
    ]);
    const store = "select soc, outlet_degC, sensors_used from rockhour_store where store = 'hot'";
    expect(await select(influx.url, store)).toEqual([[T, 0.5, 300 - 273.15, 14]]);
    const front = "select position_m, width_m from rockhour_front where front = '1'";
    expect(await select(influx.url, front)).toEqual([[T, 3, null]]);
    expect(await select(influx.url, 'select flow_factor from rockhour_string')).toEqual([[T, 1]]);
    const hours = "select hours_p90, ends_by from rockhour_dispatch where power_MW = '1.8'";
    expect(await select(influx.url, hours)).toEqual([[T, 1, 'hot_outlet']]);
    expect(await select(influx.url, 'select message, threshold from rockhour_event')).toEqual([
      [T + 5, 'the front is 1.6 times as wide as in a healthy bed', 1.5],
    ]);
  });

  it('waits while the database is down at the start and later, and then sends everything in order', async () => {
    const port = await freePort();
    const url = `http://127.0.0.1:${port}`;
    const { history, counts, told, make } = setUp(url, 100);
    fill(history, 0, 300);
    const forwarder = make();
    await waitFor('the outage to be told', () => told.length === 1);
    expect(forwarder.trouble).toContain('ECONNREFUSED');
    const influx = await startInflux(influxd!, port);
    ending.push(() => influx.stop());
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    await influx.stop();
    fill(history, 300, 400);
    await waitFor('the second outage', () => told.length === 3);
    fill(history, 400, 500);
    expect(history.outbox.backlog).toBe(200);
    await influx.start();
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    expect(told.map((line) => line.slice(0, 4))).toEqual(['down', 'up', 'down', 'up']);
    const rows = await select(url, 'select state_of_charge from rockhour_unit');
    expect(rows).toEqual(Array.from({ length: 500 }, (_, i) => [T + i * 30_000, i / 1000]));
    expect(counts.influx_set_aside).toBeUndefined();
  });

  it('goes on behind its cursor after a stop, and doubles nothing where a batch is sent twice', async () => {
    const influx = await startInflux(influxd!);
    ending.push(() => influx.stop());
    const { history, make } = setUp(influx.url, 50);
    fill(history, 0, 200);
    const first = make();
    await waitFor('a part', () => history.outbox.cursor > 0);
    await first.stop();
    // As after a power cut, which may undo the last moves of the cursor.
    history.outbox.moveTo(0);
    make();
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    const [row] = await select(influx.url, 'select count(state_of_charge) from rockhour_unit');
    expect(row![1]).toBe(200);
  });

  it('gets everything through where the database takes no large writes', async () => {
    const influx = await startInflux(influxd!, undefined, ['max-body-size = 20000']);
    ending.push(() => influx.stop());
    const { history, counts, told, make } = setUp(influx.url);
    fill(history, 0, 500);
    make();
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    const [row] = await select(influx.url, 'select count(state_of_charge) from rockhour_unit');
    expect(row![1]).toBe(500);
    expect(counts.influx_set_aside).toBeUndefined();
    expect(told).toEqual([]);
  });

  it('sets aside the point that the database refuses, alone, and says so', async () => {
    const influx = await startInflux(influxd!);
    ending.push(() => influx.stop());
    const { history, counts, told, make } = setUp(influx.url);
    fill(history, 0, 10);
    // A field that was a float before comes as text: InfluxDB refuses that point with a 400.
    const wrong = estimate(T + 10 * 30_000, 0.01);
    (wrong as { state_of_charge: unknown }).state_of_charge = 'half';
    history.estimates.add(unit, wrong, NOTHING);
    fill(history, 11, 20);
    make();
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    expect(counts.influx_set_aside).toBe(1);
    expect(told).toHaveLength(1);
    expect(told[0]).toMatch(/^refused: .*state_of_charge/);
    const [row] = await select(influx.url, 'select count(state_of_charge) from rockhour_unit');
    expect(row![1]).toBe(19);
    const [stores] = await select(influx.url, 'select count(soc) from rockhour_store');
    expect(stores![1]).toBe(20);
  });
});

describe('the forwarder, against a server that misbehaves', () => {
  async function misbehaving(answer: RequestListener): Promise<string> {
    const server: Server = createServer(answer);
    await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
    ending.push(() => {
      server.closeAllConnections();
      server.close();
    });
    return `http://127.0.0.1:${(server.address() as AddressInfo).port}`;
  }

  it('keeps what is due while it answers 503, and tells it once', async () => {
    let writes = 0;
    const url = await misbehaving((_request, response) => {
      writes++;
      response.writeHead(writes < 3 ? 503 : 204).end();
    });
    const { history, counts, told, make } = setUp(url);
    fill(history, 0, 3);
    make();
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    expect(counts.influx_failures).toBe(2);
    expect(told.map((line) => line.slice(0, 4))).toEqual(['down', 'up']);
  });

  /** The lines of a write that comes whole. */
  async function linesOf(request: IncomingMessage): Promise<string[]> {
    let text = '';
    for await (const part of request) text += part;
    return text.split('\n').filter((line) => line !== '');
  }

  it('halves what is too large for it or a proxy, and sets aside a point that is so alone', async () => {
    const MOST_BYTES = 2000;
    const taken: string[] = [];
    const url = await misbehaving(async (request, response) => {
      const lines = await linesOf(request);
      if (lines.join('\n').length > MOST_BYTES) {
        response.writeHead(413).end('<html>413 Request Entity Too Large</html>');
        return;
      }
      taken.push(...lines);
      response.writeHead(204).end();
    });
    const { history, counts, told, make } = setUp(url);
    fill(history, 0, 10);
    const long = { ...event(T + 5, 'raised'), message: 'x'.repeat(MOST_BYTES) };
    history.events.add(long);
    fill(history, 10, 20);
    make();
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    expect(taken.filter((line) => line.startsWith('rockhour_unit'))).toHaveLength(20);
    expect(taken.some((line) => line.startsWith('rockhour_event'))).toBe(false);
    expect(counts).toMatchObject({ influx_points: taken.length, influx_set_aside: 1 });
    expect(counts.influx_failures).toBeUndefined();
    expect(told).toEqual([expect.stringMatching(/^refused: it answers 413: /)]);
  });

  it('counts a point that is refused once, also where the rest of its batch is repeated', async () => {
    let outages = 0;
    const url = await misbehaving(async (request, response) => {
      const lines = await linesOf(request);
      const isFirst = lines.some((line) => line.endsWith(` ${T}`));
      if (isFirst) response.writeHead(400).end('{"error":"bad"}');
      else response.writeHead(++outages <= 2 ? 503 : 204).end();
    });
    const { history, counts, told, make } = setUp(url);
    fill(history, 0, 2);
    make();
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    const { influx_points, influx_set_aside } = counts;
    // The points of the first estimate, as many as those of the second.
    expect(influx_set_aside).toBe(influx_points);
    expect(counts.influx_failures).toBe(2);
    expect(told.filter((line) => line.startsWith('refused'))).toHaveLength(influx_set_aside!);
  });

  it('takes a refused login for an outage, not for a bad point', async () => {
    let isAllowed = false;
    const url = await misbehaving((_request, response) => {
      if (isAllowed) response.writeHead(204).end();
      else response.writeHead(401).end('{"error":"authorization failed"}');
    });
    const { history, counts, told, make } = setUp(url);
    fill(history, 0, 3);
    make();
    await waitFor('the refusal', () => told.length === 1);
    expect(told[0]).toContain('authorization failed');
    isAllowed = true;
    await waitFor('the backlog to go', () => history.outbox.backlog === 0);
    expect(counts.influx_set_aside).toBeUndefined();
  });

  it('gives up a server that hangs after five seconds, and its own stop does not wait for it', async () => {
    let asked = 0;
    const url = await misbehaving(() => void asked++);
    const { history, told, make } = setUp(url);
    fill(history, 0, 3);
    const forwarder = make();
    await waitFor('a write', () => asked > 0);
    await waitFor('the outage', () => told.length === 1, 8000);
    expect(told[0]).toContain('timed out');
    await waitFor('another try', () => asked > 1);
    const before = performance.now();
    await forwarder.stop();
    expect(performance.now() - before).toBeLessThan(2000);
    expect(history.outbox.backlog).toBe(3);
  });
});
