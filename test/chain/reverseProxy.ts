import { createServer, request } from 'node:http';

/** A reverse proxy that shows what is at `target` below a path of its own, as a site's web server does. */
export async function reverseProxy(target: string, prefix: string) {
  const { hostname, port } = new URL(target);
  const asked: string[] = [];
  const server = createServer((incoming, outgoing) => {
    const { url = '/', method, headers } = incoming;
    asked.push(url);
    if (!url.startsWith(prefix)) {
      outgoing.writeHead(404).end();
      return;
    }
    const path = url.slice(prefix.length - 1);
    const onward = request({ hostname, port, path, method, headers }, (answer) => {
      outgoing.writeHead(answer.statusCode ?? 502, answer.headers);
      answer.pipe(outgoing);
    });
    onward.on('error', () => outgoing.destroy());
    outgoing.on('close', () => onward.destroy());
    incoming.pipe(onward);
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  const address = server.address();
  if (address === null || typeof address === 'string') throw new Error('no port');
  return {
    url: `http://127.0.0.1:${address.port}${prefix}`,
    /** Paths that were asked for. */
    asked,
    close() {
      server.closeAllConnections();
      return new Promise<void>((resolve) => server.close(() => resolve()));
    },
  };
}
