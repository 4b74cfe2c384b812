import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { ReadingPublisher } from '../../src/adapters/mqtt/readingPublisher.js';
import { loadSite } from '../../src/config/load.js';
import type { SiteConfig } from '../../src/config/site.js';
import type { Estimate } from '../../src/core/estimate.js';
import { type Daemon, realCore } from '../../src/daemon.js';
import { createDemoPlant, type DemoStep } from '../../src/plant/demoPlant.js';
import { rockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { requireProgram } from '../support/requirements.js';
import { startInflux, startMosquitto } from '../support/services.js';
import { waitFor } from '../support/wait.js';
import { counted, later, makeDaemon, storedEstimates } from './harness.js';
import { siteFile } from './siteFile.js';

const mosquitto = requireProgram('mosquitto');
const influxd = requireProgram('influxd');
const SCANS = 90;

function recorded(site: SiteConfig): DemoStep[] {
  const plant = createDemoPlant(site.units[0]!);
  return Array.from({ length: SCANS }, () => plant.step());
}

/** The same steps as a recording: an empty field where a channel was silent. */
function writeRecording(site: SiteConfig, steps: readonly DemoStep[]): string {
  const ids = site.units[0]!.channels.map(({ id }) => id);
  const rows = steps.map(({ time_ms, values }) =>
    [new Date(time_ms).toISOString(), ...ids.map((id) => values[id] ?? '')].join(','),
  );
  const path = join(temporaryFolder('recording'), 'run.csv');
  writeFileSync(path, [['time', ...ids].join(','), ...rows, ''].join('\n'));
  return path;
}

async function replay(config: string, recording: string): Promise<Estimate[]> {
  const out = join(temporaryFolder('replay'), 'out.jsonl');
  const args = ['--config', config, '--recording', recording, '--out', out];
  const { code, stderr } = await rockhour(['replay', ...args, '--hours-every', '10min']);
  expect(stderr).not.toContain('[');
  expect(code).toBe(0);
  const lines = readFileSync(out, 'utf8').trim().split('\n');
  return lines.map((line) => {
    const { events: _, ...estimate } = JSON.parse(line) as Estimate & { events: unknown };
    return estimate;
  });
}

async function started(site: SiteConfig): Promise<Daemon> {
  const daemon = makeDaemon(site, { core: realCore });
  await daemon.start();
  await waitFor('the broker', () => daemon.service.health()[0]!.ok);
  return daemon;
}

describe.skipIf(!mosquitto)('a recording of the demonstration plant', () => {
  it('gives live through mosquitto, with two restarts on the way, what its replay gives, to the last bit', async () => {
    const service = await startMosquitto(mosquitto!);
    later(() => service.stop());
    const { path } = siteFile({ mqtt: { url: service.url, client_id: 'chain-test' } });
    const site = loadSite(path);
    const unit = site.units[0]!;
    const steps = recorded(site);
    const replayed = await replay(path, writeRecording(site, steps));
    const gateway = new ReadingPublisher(service.url, site.sources);
    await gateway.start();
    later(() => gateway.stop());
    let from = 0;
    for (const to of [20, 55, SCANS]) {
      const daemon = await started(site);
      const part = steps.slice(from, to);
      await Promise.all(part.map((one) => gateway.readings(unit.id, one.time_ms, one.values)));
      await counted(daemon, 'scans_complete', part.length, 30_000);
      await daemon.caughtUp();
      await daemon.stop();
      from = to;
    }
    const live = storedEstimates(site, unit.id);
    expect(replayed).toHaveLength(SCANS);
    expect(live).toEqual(replayed);
    expect(live.filter((one) => one.dispatch).length).toBeGreaterThan(3);
  }, 120_000);
});

async function select(url: string, query: string): Promise<unknown[][]> {
  const answer = await fetch(`${url}/query?db=rockhour&epoch=ms&q=${encodeURIComponent(query)}`);
  const body = (await answer.json()) as { results: { series?: { values: unknown[][] }[] }[] };
  return body.results[0]?.series?.[0]?.values ?? [];
}

describe.skipIf(!mosquitto || !influxd)(
  'the demonstration plant, from mosquitto to InfluxDB',
  () => {
    it('stands in the database as in the local store, to the last bit', async () => {
      const service = await startMosquitto(mosquitto!);
      later(() => service.stop());
      const influx = await startInflux(influxd!);
      later(() => influx.stop());
      const { path } = siteFile({
        mqtt: { url: service.url, client_id: 'influx-test', protocol: 5 },
        influx: { url: influx.url },
      });
      const site = loadSite(path);
      const unit = site.units[0]!;
      const daemon = await started(site);
      const gateway = new ReadingPublisher(service.url, site.sources);
      await gateway.start();
      later(() => gateway.stop());
      const steps = recorded(site).slice(0, 30);
      await Promise.all(steps.map((one) => gateway.readings(unit.id, one.time_ms, one.values)));
      await counted(daemon, 'scans_complete', steps.length, 30_000);
      const part = () => daemon.service.health().find(({ name }) => name === 'influxdb')!;
      await waitFor('an empty outbox', () => part().detail === '0 entries to forward');
      await daemon.stop();
      const stored = storedEstimates(site, unit.id);
      const of = (pick: (one: Estimate) => unknown) =>
        stored.map((one) => [Date.parse(one.time), pick(one)]);
      const charge = 'SELECT state_of_charge FROM rockhour_unit';
      expect(await select(influx.url, charge)).toEqual(of((one) => one.state_of_charge));
      const heat = "SELECT stored_MWh_th FROM rockhour_store WHERE store = 'hot'";
      expect(await select(influx.url, heat)).toEqual(of((one) => one.stores.hot!.stored_MWh_th));
      const flow =
        "SELECT flow_factor FROM rockhour_string WHERE store = 'cold' AND string = 'axis'";
      const factor = (one: Estimate) =>
        one.stores.cold!.strings.find(({ id }) => id === 'axis')!.flow_factor;
      expect(await select(influx.url, flow)).toEqual(of(factor));
      const hours = 'SELECT hours_p90 FROM rockhour_dispatch';
      const asked = stored.filter((one) => one.dispatch);
      const answers = (await select(influx.url, hours)).length;
      expect(answers).toBe(asked.length * unit.hours_at_W.length);
    }, 120_000);
  },
);
