import type { Database } from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { freePort } from '../support/ports.js';
import { requireProgram } from '../support/requirements.js';
import { startInflux } from '../support/services.js';
import { waitFor } from '../support/wait.js';
import { count, counted, later, makeDaemon, publisher, publishScan } from './harness.js';
import { PERIOD_MS, smallSite } from './site.js';

const influxd = requireProgram('influxd');
const START = Date.now() - 100 * PERIOD_MS;

async function countIn(url: string): Promise<number> {
  const query = 'select count(state_of_charge) from rockhour_unit';
  const answer = await fetch(`${url}/query?db=rock&q=${encodeURIComponent(query)}`);
  const body = (await answer.json()) as {
    results: { series?: { values: [string, number][] }[] }[];
  };
  return body.results[0]?.series?.[0]?.values[0]?.[1] ?? 0;
}

describe.skipIf(!influxd)('a daemon whose database comes and goes', () => {
  it('raises an alert after its delay, returns it, and in the end has forwarded every estimate', async () => {
    const port = await freePort();
    const url = `http://127.0.0.1:${port}`;
    const influx = { url, database: 'rock', username: null, password: null, batch_points: 5000 };
    const daemon = makeDaemon(smallSite(null, { influx }));
    const told: string[] = [];
    daemon.service.subscribe((message) => {
      if (message.kind === 'event') told.push(`${message.event.id} ${message.event.transition}`);
    });
    const { broker } = await daemon.start();
    const client = await publisher(broker);
    const part = () => daemon.service.health().find(({ name }) => name === 'influxdb');
    for (let i = 0; i < 10; i++) await publishScan(client, START + i * PERIOD_MS, [i, i, i]);
    await counted(daemon, 'scans', 10);
    const raised = 'u/database_unreachable/InfluxDB raised';
    const returned = 'u/database_unreachable/InfluxDB returned';
    await waitFor('the alert', () => told.includes(raised));
    expect(part()).toMatchObject({ ok: false });
    expect(part()!.detail).toMatch(/ECONNREFUSED.*wait in the local store, none is lost/);

    const service = await startInflux(influxd!, port);
    later(() => service.stop());
    await waitFor('its return', () => told.includes(returned));
    await waitFor('an empty outbox', () => part()!.detail === '0 entries to forward');
    expect(await countIn(url)).toBe(10);

    await service.stop();
    for (let i = 10; i < 20; i++) await publishScan(client, START + i * PERIOD_MS, [i, i, i]);
    await waitFor('the second alert', () => told.length === 3);
    await service.start();
    await waitFor('its return', () => told.length === 4);
    await waitFor('an empty outbox', () => part()!.detail === '0 entries to forward');
    expect(await countIn(url)).toBe(20);
    expect(told).toEqual([raised, returned, raised, returned]);
    await daemon.stop();
  }, 60_000);
});

it('a database that is away while the history cannot be written ends nothing, and is told once it can', async () => {
  const url = `http://127.0.0.1:${await freePort()}`;
  const influx = { url, database: 'rock', username: null, password: null, batch_points: 5000 };
  const daemon = makeDaemon(smallSite(null, { influx }));
  const told: string[] = [];
  daemon.service.subscribe((message) => {
    if (message.kind === 'event') told.push(`${message.event.id} ${message.event.transition}`);
  });
  await daemon.start();
  const { history } = daemon as unknown as { history: { opened: { database: Database } } };
  history.opened.database.pragma('query_only = 1');
  await waitFor('failures', () => count(daemon, 'history_failures') > 1);
  expect(told).toEqual([]);
  history.opened.database.pragma('query_only = 0');
  await waitFor('the alert', () => told.length > 0);
  expect(told).toEqual(['u/database_unreachable/InfluxDB raised']);
  await daemon.stop();
}, 30_000);
