import { connect, createServer, type Socket } from 'node:net';

/** A TCP relay that can fall silent without closing anything, as a pulled cable does. */
export async function freezingProxy(port: number) {
  const sockets = new Set<Socket>();
  let frozen = false;
  const server = createServer((client) => {
    const upstream = connect(port, '127.0.0.1');
    for (const [from, to] of [
      [client, upstream],
      [upstream, client],
    ] as const) {
      sockets.add(from);
      from.on('data', (chunk: Buffer) => {
        if (!frozen) to.write(chunk);
      });
      from.on('error', () => undefined);
      from.on('close', () => {
        sockets.delete(from);
        to.destroy();
      });
    }
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  const address = server.address();
  if (address === null || typeof address === 'string') throw new Error('no port');
  return {
    url: `http://127.0.0.1:${address.port}/`,
    freeze: () => {
      frozen = true;
    },
    thaw: () => {
      frozen = false;
      // What was swallowed cannot be given back: these connections are broken.
      for (const socket of sockets) socket.destroy();
    },
    close: () => {
      for (const socket of sockets) socket.destroy();
      return new Promise<void>((resolve) => server.close(() => resolve()));
    },
  };
}
