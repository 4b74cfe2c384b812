import { connectAsync, type MqttClient } from 'mqtt';
import { afterEach } from 'vitest';
import { History } from '../../src/adapters/history/history.js';
import { Journal, type JournalEntry } from '../../src/adapters/history/journal.js';
import type { SiteConfig } from '../../src/config/site.js';
import type { Estimate } from '../../src/core/estimate.js';
import { createDaemon, type Daemon, type DaemonOptions } from '../../src/daemon.js';
import { createLog } from '../../src/log.js';
import { waitFor } from '../support/wait.js';
import { fakeCore } from './fakeCore.js';

const ending: (() => Promise<unknown>)[] = [];
afterEach(async () => {
  for (const end of ending.splice(0).reverse()) await end();
});

/** Something that is ended after the test, last made first. */
export function later(end: () => Promise<unknown>): void {
  ending.push(end);
}

export function makeDaemon(site: SiteConfig, options: Partial<DaemonOptions> = {}): Daemon {
  const log = createLog({ level: 'silent' });
  const daemon = createDaemon(site, {
    ...{ log, version: '0', configPath: null, core: fakeCore, http: false },
    ...options,
  });
  later(() => daemon.stop());
  return daemon;
}

export async function publisher(url: string): Promise<MqttClient> {
  const client = await connectAsync(url);
  later(() => client.endAsync(true));
  return client;
}

export function publish(client: MqttClient, topic: string, content: unknown): Promise<unknown> {
  const text = typeof content === 'string' ? content : JSON.stringify(content);
  return client.publishAsync(topic, text, { qos: 1 });
}

/** Publishes a whole scan of the small unit. */
export async function publishScan(client: MqttClient, time: number, values: number[]) {
  const [a, b, c, e] = values;
  const sent = [
    publish(client, 'in/a', { time, value: a, quality: 'good' }),
    publish(client, 'in/bc', { time, values: [b, c], quality: 'good' }),
  ];
  if (e !== undefined) sent.push(publish(client, 'in/e', { time, value: e, quality: 'good' }));
  await Promise.all(sent);
}

export function count(daemon: Daemon, name: string): number {
  return daemon.service.counters()[name]!;
}

/** Waits until a counter has reached a value. */
export function counted(daemon: Daemon, name: string, value: number, limit_ms = 10_000) {
  return waitFor(`${name} ${value}`, () => count(daemon, name) >= value, limit_ms);
}

/** All estimates of a unit in a stopped daemon's history. */
export function storedEstimates(site: SiteConfig, unit = 'u'): Estimate[] {
  const history = new History(`${site.store.folder}/history.sqlite`, site.store);
  history.start();
  const found = history.estimates.between(unit, -8.64e15, 8.64e15, 1e6);
  history.stop();
  return found;
}

/** The whole journal of a stopped daemon. */
export function storedEntries(site: SiteConfig): JournalEntry[] {
  const journal = new Journal(`${site.store.folder}/journal.sqlite`);
  journal.start();
  const entries = journal.read(0, 1e6);
  journal.stop();
  return entries;
}
