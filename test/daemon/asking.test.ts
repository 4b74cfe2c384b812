import { expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import { demoSite, runDemo } from '../../src/daemon.js';
import { createLog } from '../../src/log.js';
import { latenessWhileAsked } from '../support/loopLateness.js';
import { waitFor } from '../support/wait.js';
import { later } from './harness.js';
import { siteFile } from './siteFile.js';

const CLIENTS = 20;
/** Scans of 30 s, fifteen times as fast as real: one every 2 s. */
const SPEED = 15;
const PERIOD_MS = 30_000 / SPEED;

it('asking never delays a scan: 20 clients ask while scans come in', async () => {
  const { path: configPath } = siteFile({}, 40);
  const places = { http_port: 0, mqtt_port: 0, keep: false };
  const { site, remove } = await demoSite(loadSite(configPath), places);
  later(async () => remove());
  const log = createLog({ level: 'silent' });
  const options = { log, version: '0', configPath, speed: SPEED, seed: 1, incidents: false };
  const demo = await runDemo(site, options);
  later(() => demo.stop());
  const { service } = demo.daemon;
  await waitFor('two scans', () => service.counters().scans! >= 2, 20_000);
  const before = service.counters();
  const found = await latenessWhileAsked(demo, CLIENTS, 3);
  const after = service.counters();

  const all = found.asked.flat();
  const answered = (kind: string) => all.filter((one) => one.kind === kind && one.status === 200);
  const refused = all.filter((one) => one.status !== 200);
  console.log(
    `the main loop is late by ${found.p50_ms.toFixed(0)} ms at p50, ${found.p99_ms.toFixed(0)} ms ` +
      `at p99, ${found.most_ms.toFixed(0)} ms at most; ${all.length - refused.length} answers, ` +
      `${refused.length} refusals, scans every ${PERIOD_MS} ms`,
  );
  // Each client was told something: an answer, or why there is none and when to come back.
  expect(found.asked).toHaveLength(CLIENTS);
  for (const kind of ['hours', 'headroom', 'offers', 'schedule', 'capability']) {
    expect(answered(kind).length, kind).toBeGreaterThan(0);
  }
  for (const { status, refusal } of refused) {
    expect([429, 503]).toContain(status);
    expect(refusal!.message).toMatch(/again/);
  }
  // A scan is closed by a timer and worked off by the same loop. A slice of work is 25 ms and a
  // scan some ms; a tenth of the time between scans leaves as much again for a loaded machine.
  expect(found.p99_ms).toBeLessThan(PERIOD_MS / 10);
  expect(after.scans! - before.scans!).toBeGreaterThanOrEqual(2);
  for (const name of ['scans_skipped', 'scans_empty', 'scan_failures']) {
    expect(after[name], name).toBe(before[name]);
  }
}, 90_000);
