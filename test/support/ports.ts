import { createServer } from 'node:net';

/**
 * A TCP port on 127.0.0.1 that was free a moment ago. For programs that must be told a port;
 * where a server can listen on port 0 itself, that is the safer way.
 */
export function freePort(): Promise<number> {
  return new Promise((resolve, reject) => {
    const server = createServer();
    server.once('error', reject);
    server.listen(0, '127.0.0.1', () => {
      const address = server.address();
      if (address === null || typeof address === 'string') {
        server.close();
        reject(new Error(`listening on port 0 gave the address ${String(address)}`));
        return;
      }
      server.close(() => resolve(address.port));
    });
  });
}
