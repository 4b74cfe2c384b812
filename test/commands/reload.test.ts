import { afterEach, beforeEach, expect, it, vi } from 'vitest';
import { type Configured, Reloading } from '../../src/commands/reload.js';
import type { DaemonPlaces } from '../../src/daemon.js';
import { createLog } from '../../src/log.js';
import { siteFile } from '../daemon/siteFile.js';

beforeEach(() => void vi.useFakeTimers({ toFake: ['setTimeout', 'clearTimeout'] }));
afterEach(() => void vi.useRealTimers());

it('waits for a daemon that ends slowly: the next one could not have its folder', async () => {
  const said: string[] = [];
  const places: DaemonPlaces = { url: null, broker: 'mqtt://127.0.0.1:1883', folder: '/' };
  let running = 0;
  const create = () => ({
    async start() {
      if (running > 0) throw new Error('another rockhour uses the folder');
      running++;
      said.push('up');
      return places;
    },
    async stop() {
      await new Promise((resolve) => setTimeout(resolve, 12_000));
      running--;
      said.push('ended');
    },
  });
  const reloading = new Reloading({
    ...{ log: createLog({ level: 'silent' }), create },
    up: () => undefined,
    lost: (thrown) => said.push(String(thrown)),
  });
  await reloading.start({} as Configured);
  const reloaded = reloading.reload(siteFile({}).path);
  await vi.advanceTimersByTimeAsync(13_000);
  await reloaded;
  expect(said).toEqual(['up', 'ended', 'up']);
});
