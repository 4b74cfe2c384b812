import { createServer, connect as dial, type Socket } from 'node:net';
import { connectAsync } from 'mqtt';
import { afterEach, describe, expect, it } from 'vitest';
import { ReadingPublisher } from '../../../src/adapters/mqtt/readingPublisher.js';
import { requireProgram } from '../../support/requirements.js';
import { startMosquitto } from '../../support/services.js';

const mosquitto = requireProgram('mosquitto');
const CHANNELS = 20;
const CUTS = 3;
const SILENT_MS = 100;

const ending: (() => Promise<unknown>)[] = [];
afterEach(async () => {
  for (const end of ending.splice(0).reverse()) await end();
});

/** Towards a broker; swallows what comes after the greeting and then cuts, so many times. */
async function cuttingDoor(
  port: number,
  cuts: number,
): Promise<{ url: string; left: () => number }> {
  let left = cuts;
  const open = new Set<Socket>();
  const server = createServer((near) => {
    const far = dial(port, '127.0.0.1');
    let pieces = 0;
    for (const socket of [near, far]) {
      open.add(socket);
      socket.on('error', () => undefined);
      socket.on('close', () => {
        near.destroy();
        far.destroy();
      });
    }
    far.pipe(near);
    near.on('data', (piece) => {
      // The first is the greeting; the second brings messages, or those that are sent again. What is
      // published while these wait for an answer that never comes is in no store yet.
      pieces++;
      if (pieces === 1 || left === 0) far.write(piece);
      else if (pieces === 2) {
        setTimeout(() => {
          left--;
          near.destroy();
        }, SILENT_MS);
      }
    });
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  ending.push(() => {
    for (const socket of open) socket.destroy();
    return new Promise((resolve) => server.close(resolve));
  });
  const address = server.address() as { port: number };
  return { url: `mqtt://127.0.0.1:${address.port}`, left: () => left };
}

describe.skipIf(!mosquitto)('the publisher of readings', () => {
  it('has every reading at the broker in spite of connections that end while it sends', async () => {
    const broker = await startMosquitto(mosquitto!);
    ending.push(() => broker.stop());
    const door = await cuttingDoor(Number(new URL(broker.url).port), CUTS);
    const listener = await connectAsync(broker.url);
    ending.push(() => listener.endAsync(true));
    const heard = new Set<string>();
    listener.on('message', (topic, payload) => heard.add(`${topic} ${payload.toString()}`));
    await listener.subscribeAsync('in/#', { qos: 1 });
    const sources = Array.from({ length: CHANNELS }, (_, i) => ({
      ...{ unit: 'u', topic: `in/${i}`, channels: [`c${i}`], payload: 'value' as const },
    }));
    const publisher = new ReadingPublisher(door.url, sources);
    ending.push(() => publisher.stop());
    await publisher.start();
    const values = Object.fromEntries(sources.map(({ channels }, i) => [channels[0]!, i]));
    const rounds: Promise<void>[] = [];
    while (door.left() > 0 || rounds.length === 0) {
      rounds.push(publisher.readings('u', 1_790_000_000_000 + 1000 * rounds.length, values));
      await new Promise((resolve) => setTimeout(resolve, SILENT_MS / 2));
    }
    await Promise.all(rounds);
    await expect.poll(() => heard.size).toBe(CHANNELS * rounds.length);
  }, 30_000);
});
