import { describe, expect, it } from 'vitest';
import { requireProgram } from '../support/requirements.js';
import { startMosquitto } from '../support/services.js';
import { count, later, makeDaemon, publish, publisher, storedEntries } from './harness.js';
import { smallSite } from './site.js';

const mosquitto = requireProgram('mosquitto');
const BURST = 5000;
const PART = 1000;

describe.skipIf(!mosquitto)(
  "a broker with mosquitto's own limits (20 in flight, 1000 queued)",
  () => {
    it('loses nothing of bursts of 1000 messages while the daemon is there', async () => {
      const service = await startMosquitto(mosquitto!, undefined, [], { limits: 'default' });
      later(() => service.stop());
      const site = smallSite(service.url);
      const daemon = makeDaemon(site);
      await daemon.start();
      const client = await publisher(service.url);
      const start = Date.now() - 60_000;
      // Each part fits into the queue: what is beyond it a broker drops, and nobody else knows of it.
      for (let from = 0; from < BURST; from += PART) {
        const part = Array.from({ length: PART }, (_, i) => from + i);
        await Promise.all(
          part.map((i) => publish(client, 'in/a', { time: start + i, value: i + 0.5 })),
        );
        await expect.poll(() => count(daemon, 'readings'), { timeout: 25_000 }).toBe(from + PART);
      }
      await daemon.stop();
      const values = storedEntries(site).flatMap((one) =>
        one.kind === 'reading' ? [one.value] : [],
      );
      expect(values).toEqual(Array.from({ length: BURST }, (_, i) => i + 0.5));
      // 250 syncs of the disk, which others may use as well.
    }, 120_000);
  },
);
