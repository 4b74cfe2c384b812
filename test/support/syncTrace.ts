/**
 * Reads what strace saw of a daemon (`-f -y -xx`, whole strings) and tells of each acknowledgement
 * whether its reading was on the disk by then.
 */

/** One call, in the order of the trace: a write at its begin, a sync at its end. */
export type TracedCall =
  | { readonly kind: 'write'; readonly file: string; readonly bytes: Buffer }
  | { readonly kind: 'sync'; readonly file: string };

const LINE = /^(\d+) +(.*)$/;
const CALL = /^(\w+)\((\d+)<([^>]*)>(.*)$/s;
const RESUMED = /^<\.\.\. (\w+) resumed>.*= 0$/;
const SYNCS = new Set(['fdatasync', 'fsync']);

/** Writes and completed syncs of a trace. */
export function callsOf(trace: string): TracedCall[] {
  const calls: TracedCall[] = [];
  /** File of the sync that a thread is in. */
  const within = new Map<string, string>();
  for (const line of trace.split('\n')) {
    const [, thread, text] = LINE.exec(line) ?? [];
    if (thread === undefined || text === undefined) continue;
    const resumed = RESUMED.exec(text);
    if (resumed) {
      const file = within.get(thread);
      if (SYNCS.has(resumed[1]!) && file !== undefined) calls.push({ kind: 'sync', file });
      continue;
    }
    const [, name, , at, rest] = CALL.exec(text) ?? [];
    if (name === undefined || at === undefined || rest === undefined) continue;
    const file = pathOf(at);
    if (SYNCS.has(name)) {
      if (rest.includes('<unfinished')) within.set(thread, file);
      else if (/= 0$/.test(rest)) calls.push({ kind: 'sync', file });
    } else calls.push({ kind: 'write', file, bytes: takenOf(rest) });
  }
  return calls;
}

/** A path that strace writes in hexadecimal, or `TCP:[...]` and the like as it is. */
function pathOf(text: string): string {
  return text.startsWith('\\x') ? hex(text).toString() : text;
}

function hex(text: string): Buffer {
  return Buffer.from(text.replaceAll('\\x', ''), 'hex');
}

/** All that a write was given, in order, as far as it was taken. */
function takenOf(rest: string): Buffer {
  const bytes = Buffer.concat(
    [...rest.matchAll(/"((?:\\x[0-9a-f]{2})*)"/g)].map(([, one]) => hex(one!)),
  );
  const taken = /= (\d+)$/.exec(rest);
  return taken ? bytes.subarray(0, Number(taken[1])) : bytes;
}

export interface SyncReport {
  /** Acknowledgements seen. */
  readonly acknowledged: number;
  /** Numbers of readings that were acknowledged before they were on the disk. */
  readonly early: number[];
  readonly syncs: number;
}

/**
 * Holds each PUBACK against the syncs before it: the k-th acknowledges reading k, as with one publisher
 * and one topic, and reading k is on the disk when a sync of the journal has ended after a write of its
 * value into the journal's write-ahead log.
 *
 * @param values of the readings in their order, each once and none a whole number, so that SQLite
 *   stores it as the eight bytes of a double
 */
export function acknowledgedAfterSync(
  calls: readonly TracedCall[],
  values: readonly number[],
): SyncReport {
  const patterns = values.map((value) => {
    const bytes = Buffer.alloc(8);
    bytes.writeDoubleBE(value);
    return bytes;
  });
  const written = new Set<number>();
  const synced = new Set<number>();
  const early: number[] = [];
  const streams = new Map<string, Buffer>();
  let acknowledged = 0;
  let syncs = 0;
  for (const call of calls) {
    const isLog = call.file.endsWith('/journal.sqlite-wal');
    if (call.kind === 'sync') {
      if (!isLog) continue;
      syncs++;
      for (const i of written) synced.add(i);
      written.clear();
    } else if (isLog) {
      patterns.forEach((pattern, i) => {
        if (!synced.has(i) && call.bytes.includes(pattern)) written.add(i);
      });
    } else if (call.file.startsWith('socket')) {
      const stream = streams.get(call.file);
      // The connection to the broker is the one that begins with a CONNECT.
      if (stream === undefined && !call.bytes.subarray(0, 12).includes('MQTT')) continue;
      const { rest, acknowledgements } = packetsOf(
        Buffer.concat([stream ?? Buffer.alloc(0), call.bytes]),
      );
      streams.set(call.file, rest);
      for (let n = 0; n < acknowledgements; n++) {
        if (!synced.has(acknowledged)) early.push(acknowledged);
        acknowledged++;
      }
    }
  }
  return { acknowledged, early, syncs };
}

const PUBACK = 4;

/** Counts the PUBACKs of a stream of MQTT packets; what is not a whole packet yet is the rest. */
function packetsOf(stream: Buffer): { rest: Buffer; acknowledgements: number } {
  let acknowledgements = 0;
  let at = 0;
  for (;;) {
    let length = 0;
    let head = 1;
    for (; ; head++) {
      const byte = stream[at + head];
      if (byte === undefined || head > 4) return { rest: stream.subarray(at), acknowledgements };
      length += (byte & 127) * 128 ** (head - 1);
      if (byte < 128) break;
    }
    const end = at + head + 1 + length;
    if (end > stream.length) return { rest: stream.subarray(at), acknowledgements };
    if (stream[at]! >> 4 === PUBACK) acknowledgements++;
    at = end;
  }
}
