import { createServer, request, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import { afterEach, describe, expect, it } from 'vitest';
import { waitFor } from '../../support/wait.js';
import { testApp } from './httpApp.js';
import { readStream } from './sseReader.js';

const toClose: (() => Promise<unknown>)[] = [];
afterEach(async () => {
  for (const close of toClose.splice(0).reverse()) await close();
});

/**
 * A reverse proxy for everything below `/works/heat`, which it strips or keeps, and nothing else. It
 * holds an answer back to its end, as nginx may, unless told not to buffer.
 */
function proxyTo(port: number, strips: boolean): Promise<string> {
  const server: Server = createServer((asked, answered) => {
    const url = asked.url ?? '';
    if (!url.startsWith('/works/heat/')) {
      answered.writeHead(404).end();
      return;
    }
    const path = strips ? url.slice('/works/heat'.length) : url;
    const { method, headers } = asked;
    const onward = request({ host: '127.0.0.1', port, method, path, headers }, (answer) => {
      answered.writeHead(answer.statusCode ?? 502, answer.headers);
      if (answer.headers['x-accel-buffering'] === 'no') {
        answer.pipe(answered);
        return;
      }
      const held: Buffer[] = [];
      answer.on('data', (chunk: Buffer) => held.push(chunk));
      answer.on('end', () => answered.end(Buffer.concat(held)));
    });
    onward.on('error', () => answered.destroy());
    answered.on('close', () => onward.destroy());
    asked.pipe(onward);
  });
  toClose.push(
    () =>
      new Promise((resolve) => {
        server.close(resolve);
        server.closeAllConnections();
      }),
  );
  return new Promise((resolve) => {
    server.listen(0, '127.0.0.1', () => {
      resolve(`http://127.0.0.1:${(server.address() as AddressInfo).port}/works/heat/`);
    });
  });
}

async function behindProxy(strips: boolean) {
  const { app, stream, plant } = await testApp({ prefix: strips ? '' : '/works/heat' });
  stream.start();
  toClose.push(() => app.close());
  await app.listen({ host: '127.0.0.1', port: 0 });
  const { port } = app.server.address() as AddressInfo;
  return { base: await proxyTo(port, strips), plant };
}

/** All that the page is given to do, and nothing more. */
const POLICY = {
  'default-src': "'none'",
  'script-src': "'self'",
  'style-src': "'self'",
  'img-src': "'self'",
  'connect-src': "'self'",
  'base-uri': "'none'",
  'form-action': "'none'",
  'frame-ancestors': "'none'",
};

describe.each([
  ['strips', true],
  ['keeps', false],
])('behind a reverse proxy that %s a path', (_, strips) => {
  it('serves page, answers and reports below that path, under the strict policy', async () => {
    const { base } = await behindProxy(strips);
    const page = await fetch(base);
    expect([page.status, await page.text()]).toEqual([200, expect.stringContaining('<title>')]);
    const policy = String(page.headers.get('content-security-policy'));
    const rules = policy.split(';').map((rule) => rule.trim().split(/ (.*)/).slice(0, 2));
    expect(Object.fromEntries(rules)).toEqual(POLICY);
    expect(page.headers.get('x-content-type-options')).toBe('nosniff');
    const list = await fetch(new URL('api/units', base));
    expect(await list.json()).toMatchObject({ units: [{ unit: 'north' }] });
    const report = await fetch(new URL('api/units/north/report', base));
    expect([report.status, await report.text()]).toEqual([200, 'report as html']);
    expect((await fetch(new URL('/api/units', base))).status).toBe(404);
  });

  it('lets the stream through as it comes', async () => {
    const { base, plant } = await behindProxy(strips);
    const client = readStream(new URL('api/stream', base).href);
    await waitFor('hello', () => client.of('hello').length === 1);
    plant.step();
    await waitFor('a state', () => client.of('state').length > 0);
    expect(client.state.ended).toBe(false);
    client.close();
  });
});
