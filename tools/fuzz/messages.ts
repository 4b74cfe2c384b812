import { type Rolls, randomBytesOf } from './rolls.js';

/** A message to the broker; `kind` is what it tries. */
export interface FuzzMessage {
  readonly kind: string;
  readonly topic: string;
  readonly payload: Buffer;
}

export interface FuzzTopics {
  readonly value: readonly string[];
  readonly array: readonly { readonly topic: string; readonly length: number }[];
  /** Topics that nothing is configured for begin with one of these. */
  readonly strange: readonly string[];
}

const HUGE = [
  1e308,
  -1e308,
  Number.POSITIVE_INFINITY,
  5e-324,
  2 ** 53 + 1,
  -0,
  8.64e15,
  8.65e15,
  1e21,
];
const WRONG: readonly unknown[] = [null, true, {}, [], 'x', '12', '', [[1]], { valueOf: 1 }];
const KEYS = [
  '__proto__',
  'constructor',
  'prototype',
  'toString',
  'then',
  'length',
  'time',
  'value',
];

type Make = (rolls: Rolls, now_ms: number) => Buffer;

const json = (content: unknown) => Buffer.from(JSON.stringify(content) ?? '');
const timeOf = (rolls: Rolls, now_ms: number): unknown =>
  rolls.pick<() => unknown>([
    () => now_ms,
    () => new Date(now_ms - rolls.below(1e7)).toISOString(),
    () => now_ms - rolls.below(1e9),
    () => now_ms + rolls.below(1e9),
    () => rolls.pick(HUGE),
    () => rolls.pick(WRONG),
    () => '2026-02-30T25:61:00Z',
    () => '1970-01-01T00:00:00.000Z',
    () => undefined,
  ])();

const sound: Make = (rolls, now_ms) =>
  json({ time: now_ms, value: rolls.below(1000) / 2, quality: 'good' });

/** Ways to be wrong, by name. */
const MAKERS: Readonly<Record<string, Make>> = {
  sound,
  bytes: (rolls) => randomBytesOf(rolls, rolls.below(200)),
  truncated: (rolls, now_ms) => {
    const whole = sound(rolls, now_ms);
    return whole.subarray(0, rolls.below(whole.length));
  },
  nested: (rolls) => {
    const depth = 1 + rolls.below(rolls.below(50) === 0 ? 200_000 : 200);
    const [open, close] = rolls.pick([
      ['[', ']'],
      ['{"value":', '}'],
    ] as const);
    const ends = rolls.below(2) === 0;
    return Buffer.from(open.repeat(depth) + (ends ? `1${close.repeat(depth)}` : ''));
  },
  numbers: (rolls, now_ms) =>
    Buffer.from(
      `{"time":${rolls.pick([String(now_ms), '1e999', '-1e400', '1e308', '9'.repeat(400)])},` +
        `"value":${rolls.pick(['1e999', '-1e999', '1e308', '9'.repeat(400), '0.1e-400', '-0'])}}`,
    ),
  types: (rolls, now_ms) =>
    json({ time: timeOf(rolls, now_ms), value: rolls.pick(WRONG), quality: rolls.pick(WRONG) }),
  times: (rolls, now_ms) => json({ time: timeOf(rolls, now_ms), value: rolls.below(500) }),
  arrays: (rolls, now_ms) => {
    const length = rolls.below(40);
    const one = () => (rolls.below(6) === 0 ? rolls.pick([...WRONG, ...HUGE]) : rolls.below(500));
    const values = Array.from({ length }, one);
    const quality = rolls.pick<unknown>(['good', 'bad', ['good'], values.map(() => 'good')]);
    return json({ time: timeOf(rolls, now_ms), values, quality });
  },
  keys: (rolls, now_ms) => {
    const own = Array.from({ length: 1 + rolls.below(5) }, () => rolls.pick(KEYS));
    const fields = own.map((key) => `"${key}":${rolls.pick(['1', '{"value":1}', '[]', '"x"'])}`);
    return Buffer.from(`{"time":${now_ms},${fields.join(',')}}`);
  },
  text: (rolls, now_ms) =>
    json({
      time: now_ms,
      value: rolls.pick(['\u0000', '\ud800', '\u202e', '\u001b[2J', '𝄞', 'charge']),
    }),
  huge: (rolls, now_ms) => {
    const length = rolls.below(20) === 0 ? 1_000_000 : 20_000;
    return rolls.below(2) === 0
      ? Buffer.alloc(length, rolls.pick(['[', ' ', 'a', '\0']))
      : json({ time: now_ms, value: 1, more: 'x'.repeat(length) });
  },
  /** Bytes as another format has them: field keys, lengths that lie, nothing behind them. */
  sparkplug: (rolls, now_ms) => {
    const head = Buffer.from([
      0x08,
      ...varint(now_ms),
      0x12,
      rolls.below(256),
      0x0a,
      rolls.below(128),
    ]);
    const tail = randomBytesOf(rolls, rolls.below(80));
    return Buffer.concat([head, tail, Buffer.from([0x18, ...varint(rolls.below(1e6))])]);
  },
};

const SPARKPLUG_KINDS = ['NBIRTH', 'NDATA', 'NDEATH', 'DBIRTH', 'DDATA', 'DDEATH', 'NCMD', 'X'];

/** The next message; all follows from the rolls and the time. */
export function fuzzMessage(rolls: Rolls, topics: FuzzTopics, now_ms: number): FuzzMessage {
  const names = Object.keys(MAKERS);
  // Few are huge: each is as dear as a thousand others.
  const drawn = rolls.pick(names);
  const kind = drawn === 'huge' && rolls.below(20) > 0 ? 'types' : drawn;
  const payload = MAKERS[kind]!(rolls, now_ms);
  if (kind === 'sparkplug') {
    const node = `${rolls.pick(SPARKPLUG_KINDS)}/${rolls.below(9)}`;
    return { kind, topic: `spBv1.0/fuzz/${node}`, payload };
  }
  if (rolls.below(12) === 0) return { kind: 'topic', topic: strangeTopic(rolls, topics), payload };
  if (kind === 'arrays') {
    const { topic } = rolls.pick(topics.array);
    return { kind, topic, payload };
  }
  const all = rolls.below(8) === 0 ? topics.array.map(({ topic }) => topic) : topics.value;
  return { kind, topic: rolls.pick(all), payload };
}

function strangeTopic(rolls: Rolls, { strange }: FuzzTopics): string {
  const end = rolls.pick([
    '__proto__',
    'constructor',
    '..',
    '../../etc',
    'ä'.repeat(50),
    '',
    ' ',
    'x',
  ]);
  return `${rolls.pick(strange)}/${end}/${rolls.below(50)}`;
}

function varint(value: number): number[] {
  const bytes: number[] = [];
  let left = value;
  while (left >= 128) {
    bytes.push((left % 128) | 128);
    left = Math.floor(left / 128);
  }
  return [...bytes, left];
}
