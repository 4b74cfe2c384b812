import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { History } from '../../src/adapters/history/history.js';
import { loadSite } from '../../src/config/load.js';
import type { EventKind } from '../../src/core/watch/event.js';
import { KIND_CLASSES } from '../../src/core/watch/kinds.js';
import { rockhour } from '../support/cli.js';
import { RockhourProcess } from './processes.js';
import { siteFile } from './siteFile.js';

const RAISED = ['front_spread', 'outlet_near_limit', 'valve_leaks', 'gas_temperature_off'] as const;
const idOf = (kind: EventKind) => `vellmoor/${kind}/hot`;

/** Alarms that stand in the history from before, as if their conditions had been found then. */
function seed(path: string): void {
  const site = loadSite(path);
  const history = new History(join(site.store.folder, 'history.sqlite'), site.store);
  history.start();
  for (const kind of RAISED) {
    history.events.add({
      ...{ id: idOf(kind), unit: 'vellmoor', kind, ...KIND_CLASSES[kind], subject: 'hot' },
      ...{ transition: 'raised', time: new Date(Date.now() - 60_000).toISOString() },
      ...{ value: 1.5, limit: 1.3, message: 'seeded' },
    });
  }
  history.stop();
}

// biome-ignore lint/suspicious/noExplicitAny: what a client sees
async function ask(page: string, path: string, body?: object): Promise<any> {
  const answer = await fetch(`${page}/api/alarms${path}`, {
    ...(body === undefined ? {} : { method: 'POST', body: JSON.stringify(body) }),
    headers: body === undefined ? {} : { 'content-type': 'application/json' },
  });
  return { status: answer.status, ...((await answer.json()) as object) };
}

const pageOf = (ready: string) => /page=(\S+?)\/? /.exec(ready)![1]!;

describe('alarms of a daemon that is killed', () => {
  it('are as they were to the last word: acknowledged, shelved until, out of service, and to be had from the command line', async () => {
    const { path } = siteFile({ mqtt: { embedded_port: 0 } }, 20);
    seed(path);
    const start = async () => {
      const daemon = new RockhourProcess(['run', '--config', path, '--log-level', 'warn']);
      return { daemon, page: pageOf(await daemon.ready()) };
    };
    const first = await start();
    const asked_ms = Date.now();
    const word = (kind: EventKind, more: object = {}) => ({ id: idOf(kind), who: 'mara', ...more });
    await ask(first.page, '/acknowledge', word('front_spread'));
    const why = 'valve being lapped';
    await ask(first.page, '/out-of-service', word('valve_leaks', { why }));
    const shelf = word('gas_temperature_off', { hours: 2, why: 'calibration' });
    const shelved = await ask(first.page, '/shelve', shelf);
    // The answer is out, so the word is on disk: nothing else may be needed.
    await first.daemon.end('SIGKILL');

    const second = await start();
    const lists = await ask(second.page, '?unit=vellmoor');
    const byId = new Map<string, { state: string; shelved: { until: string } | null }>(
      [...lists.standing, ...lists.suppressed].map((one) => [one.id, one]),
    );
    expect(byId.get(idOf('front_spread'))).toMatchObject({
      ...{ state: 'acknowledged', acknowledged_by: 'mara', letter: 'C', message: 'seeded' },
    });
    expect(byId.get(idOf('outlet_near_limit'))).toMatchObject({
      ...{ class: 'alarm', priority: 'high', respond_within_h: 0.5 },
    });
    expect(byId.get(idOf('valve_leaks'))).toMatchObject({
      ...{ state: 'out_of_service', out_of_service: { by: 'mara', why } },
    });
    const { until } = byId.get(idOf('gas_temperature_off'))!.shelved!;
    expect(until).toBe(shelved.alarm.shelved.until);
    expect(Math.abs(Date.parse(until) - asked_ms - 7_200_000)).toBeLessThan(5000);
    const { transitions } = await ask(second.page, `/transitions?id=${idOf('valve_leaks')}`);
    expect(transitions.map((one: { what: string; who: string }) => [one.what, one.who])).toEqual([
      ['out_of_service', 'mara'],
      ['raised', null],
    ]);

    const command = (...args: string[]) => rockhour(['alarms', '--url', second.page, ...args]);
    const [list, back, wrong] = await Promise.all([
      command(),
      command('--return-to-service', idOf('valve_leaks'), '--who', 'ole', '--json'),
      command('--shelve', idOf('front_spread'), '--for', '9h', '--who', 'ole', '--why', 'x'),
    ]);
    expect(list.stdout).toContain(`acknowledged by mara: ${idOf('front_spread')}`);
    expect(list.stdout).toMatch(/to do within 30 min: Lower the power or prepare the change-over/);
    expect(list.stdout).toContain(`shelved: ${idOf('gas_temperature_off')}, stands, by mara until`);
    expect(JSON.parse(back.stdout)).toMatchObject({ state: 'unacknowledged', who: 'ole' });
    expect([wrong.code, wrong.stderr]).toEqual([
      2,
      expect.stringContaining('from 1/60 (a minute) to 8'),
    ]);
    expect(await ask(second.page, '/figures')).toMatchObject({ held_back: { shelved: 1 } });
    expect(await second.daemon.end('SIGTERM')).toBe(0);
  }, 240_000);
});
