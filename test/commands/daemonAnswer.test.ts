import { createServer, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { askDaemon } from '../../src/commands/daemonAnswer.js';
import { freePort } from '../support/ports.js';

const ANSWERS: Readonly<Record<string, { status: number; body: string }>> = {
  '/plant/api/units': { status: 200, body: '{"units":[]}' },
  '/plant/api/units/U9': { status: 404, body: '{"error":{"message":"there is no unit \\"U9\\""}}' },
  '/plant/often': { status: 429, body: '{"error":{"message":"more than 3"}}' },
  '/plant/nothing': { status: 404, body: 'Not Found' },
  '/plant/html': { status: 200, body: '<html>another server</html>' },
  '/plant/proxy': { status: 502, body: 'Bad gateway' },
};

let server: Server;
let base: string;
beforeAll(async () => {
  server = createServer((request, response) => {
    const { status, body } = ANSWERS[request.url ?? ''] ?? { status: 500, body: '' };
    response.writeHead(status).end(body);
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  base = `http://127.0.0.1:${(server.address() as AddressInfo).port}/plant/`;
});
afterAll(() => {
  server.close();
});

describe('asking a daemon', () => {
  it('gives its answer, with or without a slash at the end of the address', async () => {
    expect(await askDaemon(base, '/api/units')).toEqual({ units: [] });
    expect(await askDaemon(base.slice(0, -1), '/api/units')).toEqual({ units: [] });
  });

  it.each([
    ['/often', 'answered with 429: more than 3'],
    ['/nothing', 'answered with 404: Not Found'],
    ['/html', 'has not answered in JSON'],
    ['/proxy', 'answered with 502: Bad gateway'],
    ['/else', 'answered with 500: an empty body'],
  ])('tells what came back from %s', async (path, words) => {
    await expect(askDaemon(base, path)).rejects.toMatchObject({
      code: 'DAEMON_REFUSED',
      message: expect.stringContaining(words),
    });
  });

  it('takes a question that the daemon finds wrong for a wrong command line', async () => {
    const wrong = askDaemon(base, '/api/units/U9');
    await expect(wrong).rejects.toMatchObject({ code: 'USAGE', message: 'there is no unit "U9"' });
    await expect(wrong).rejects.toMatchObject({ exitCode: 2 });
  });

  it('says where nothing answers', async () => {
    const url = `http://127.0.0.1:${await freePort()}`;
    await expect(askDaemon(url, '/api/units')).rejects.toMatchObject({
      code: 'DAEMON_UNREACHABLE',
      message: expect.stringContaining(`${url}/api/units`),
    });
  });

  it.each(['plant', 'ftp://host', 'http://'])('takes %s for no address', async (url) => {
    await expect(askDaemon(url, '/')).rejects.toMatchObject({ code: 'USAGE' });
  });
});
