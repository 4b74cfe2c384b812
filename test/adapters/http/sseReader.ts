import { request } from 'node:http';

export interface StreamMessage {
  id: string | null;
  event: string;
  data: Record<string, unknown>;
}

/** A client of the live stream over a real socket, which keeps what it gets. */
export function readStream(url: string, headers: Record<string, string> = {}) {
  const messages: StreamMessage[] = [];
  const state = { status: 0, headers: {} as Record<string, unknown>, ended: false, body: '' };
  const asked = request(url, { headers: { accept: 'text/event-stream', ...headers } }, (answer) => {
    state.status = answer.statusCode ?? 0;
    state.headers = answer.headers;
    answer.setEncoding('utf8');
    let rest = '';
    answer.on('data', (chunk: string) => {
      state.body += chunk;
      const blocks = (rest + chunk).split('\n\n');
      rest = blocks.pop() ?? '';
      for (const block of blocks) messages.push(parse(block));
    });
    answer.on('close', () => {
      state.ended = true;
    });
    answer.on('error', () => {
      state.ended = true;
    });
  });
  asked.on('error', () => {
    state.ended = true;
  });
  asked.end();
  return {
    messages,
    state,
    of: (event: string) => messages.filter((message) => message.event === event),
    close: () => asked.destroy(),
  };
}

function parse(block: string): StreamMessage {
  const field = (name: string) =>
    block
      .split('\n')
      .find((line) => line.startsWith(`${name}: `))
      ?.slice(name.length + 2) ?? null;
  return {
    id: field('id'),
    event: field('event') ?? '',
    data: JSON.parse(field('data') ?? 'null'),
  };
}
