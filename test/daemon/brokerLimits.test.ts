import { describe, expect, it } from 'vitest';
import { requireProgram } from '../support/requirements.js';
import { startMosquitto } from '../support/services.js';
import { count, later, makeDaemon, publish, publisher, storedEntries } from './harness.js';
import { smallSite } from './site.js';

const mosquitto = requireProgram('mosquitto');
const BURST = 5000;

describe.skipIf(!mosquitto)(
  "a broker with mosquitto's own limits (20 in flight, 1000 queued)",
  () => {
    it('loses nothing of a burst of 5000 messages while the daemon is there', async () => {
      const service = await startMosquitto(mosquitto!, undefined, [], { limits: 'default' });
      later(() => service.stop());
      const site = smallSite(service.url);
      const daemon = makeDaemon(site);
      await daemon.start();
      const client = await publisher(service.url);
      const start = Date.now() - 60_000;
      const sent: Promise<unknown>[] = [];
      for (let i = 0; i < BURST; i++) {
        sent.push(publish(client, 'in/a', { time: start + i, value: i + 0.5 }));
      }
      await Promise.all(sent);
      await expect.poll(() => count(daemon, 'readings'), { timeout: 25_000 }).toBe(BURST);
      await daemon.stop();
      const values = storedEntries(site).flatMap((one) =>
        one.kind === 'reading' ? [one.value] : [],
      );
      expect(values).toEqual(Array.from({ length: BURST }, (_, i) => i + 0.5));
    });
  },
);
