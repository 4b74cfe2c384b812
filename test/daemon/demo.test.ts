import { existsSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import { demoSite, runDemo, runDemoCheck } from '../../src/daemon.js';
import { createLog } from '../../src/log.js';
import { waitFor } from '../support/wait.js';
import { later, publisher } from './harness.js';

const configPath = fileURLToPath(new URL('../../config/demo.yaml', import.meta.url));
const OPTIONS = {
  ...{ log: createLog({ level: 'silent' }), version: '0', configPath, seed: 1, incidents: true },
};

async function ownSite() {
  const made = await demoSite(loadSite(configPath), { http_port: 0, mqtt_port: 0, keep: false });
  later(async () => made.remove());
  return made;
}

describe('the demonstration', () => {
  it('shows a live page, its API and the truth over MQTT, and leaves nothing behind', async () => {
    const { site, remove } = await ownSite();
    const demo = await runDemo(site, { ...OPTIONS, speed: 600 });
    later(() => demo.stop());
    const unit = site.units[0]!.id;
    const { service } = demo.daemon;
    await waitFor('ten scans', () => service.counters().scans! >= 10, 20_000);
    const now = service.now(unit)!;
    expect(now.stale).toBe(false);
    // The plant's clock is the daemon's: nothing is older than a scan or two.
    expect(now.age_s).toBeLessThan(90);
    const { rejected: _, ...counters } = service.counters();
    expect(counters).toMatchObject({ malformed: 0, late: 0, future: 0, scans_empty: 0 });
    const { thermocouples, thermocouples_used, thermocouples_rejected, ...further } = counters;
    expect(thermocouples_used).toBeGreaterThan(0);
    expect(thermocouples_used! + thermocouples_rejected!).toBe(
      thermocouples! - further.thermocouples_left_out! - further.thermocouples_missing!,
    );
    const answer = await fetch(`${demo.places.url}api/units`);
    expect(answer.status).toBe(200);
    const truths: string[] = [];
    const client = await publisher(demo.places.broker);
    client.on('message', (_topic, payload) => truths.push(payload.toString()));
    await client.subscribeAsync('demo/truth/#');
    await waitFor('the truth', () => truths.length > 0);
    expect(JSON.parse(truths[0]!)).toMatchObject({ mode: 'charge', stores: { hot: {} } });
    // A question is answered by the worker, which reads the configuration itself.
    const { answers } = await service.hours(unit, [1.5]);
    expect(answers[0]!.hours.p90).toBeLessThanOrEqual(answers[0]!.hours.p50);
    await demo.stop();
    expect(existsSync(site.store.folder)).toBe(true);
    remove();
    expect(existsSync(site.store.folder)).toBe(false);
  }, 60_000);

  it('scores the estimates of a simulated hour against the truth, every scan of it', async () => {
    const { site } = await ownSite();
    const done: number[] = [];
    const [check, ...more] = await runDemoCheck(site, OPTIONS, 1, (hours) => done.push(hours));
    expect(more).toEqual([]);
    expect(check).toMatchObject({ unit: site.units[0]!.id, hours: 1, scans: 120 });
    const figures = new Map(check!.scores.map((score) => [score.what, score]));
    expect(figures.get('state of charge, hot')!.count).toBe(120);
    // Settled within the hour: the design asks for hundredths of the range after that.
    expect(figures.get('state of charge, hot')!.rms).toBeLessThan(1);
    // With the first scan, and at each of the six full ten minutes.
    expect(figures.get('hours at 1.8 MW (p50)')!.count).toBe(7);
    for (const { rms, worst } of figures.values())
      expect(Math.abs(worst)).toBeGreaterThanOrEqual(rms);
    expect(done.at(-1)).toBe(1);
  }, 120_000);
});
