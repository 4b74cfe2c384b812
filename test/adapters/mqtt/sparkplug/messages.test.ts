import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  MOST_BYTES,
  MOST_METRICS,
  readPayload,
  writePayload,
  writeProperties,
} from '../../../../src/adapters/mqtt/sparkplug/messages.js';
import {
  DATATYPE,
  metricValue,
  qualityOf,
} from '../../../../src/adapters/mqtt/sparkplug/values.js';
import { EdgeNode, encode, outside, plain, type Sent } from './edge.js';
import { harness, T0 } from './hostHarness.js';

type Types = keyof typeof DATATYPE;

/** What the outside encoder makes of a value, as rockhour reads it. */
function through(type: Types, value: unknown): unknown {
  const read = readPayload(encode({ metrics: [{ name: 'm', type, value } as never] }));
  if (typeof read === 'string') return read;
  const metric = read.metrics![0]!;
  return metricValue(metric, metric.datatype);
}

/** The same where a number of 32 bits is on the wire. */
const whole = (type: Types, intValue: number) =>
  metricValue({ intValue, datatype: DATATYPE[type] }, DATATYPE[type]);

describe('values as the outside encoder writes them', () => {
  it('of every type come back the same', () => {
    const int = (bits: number) => fc.integer({ min: -(2 ** (bits - 1)), max: 2 ** (bits - 1) - 1 });
    const uint = (bits: number) => fc.integer({ min: 0, max: 2 ** bits - 1 });
    const cases: [Types, fc.Arbitrary<unknown>][] = [
      ['Int8', int(8)],
      ['Int16', int(16)],
      ['Int32', int(32)],
      ['Int64', fc.maxSafeInteger()],
      ['UInt8', uint(8)],
      ['UInt16', uint(16)],
      ['UInt32', uint(32)],
      ['UInt64', fc.maxSafeNat()],
      ['DateTime', fc.maxSafeNat()],
      ['Float', fc.float({ noNaN: true })],
      ['Double', fc.double({ noNaN: true })],
      ['Boolean', fc.boolean()],
      ['String', fc.string()],
    ];
    for (const [type, values] of cases) {
      const holds = fc.property(values, (value) => {
        expect(through(type, value)).toEqual(value);
      });
      fc.assert(holds, { numRuns: 50 });
    }
  });

  it('are refused where they are beyond 2^53, their width or their type', () => {
    expect(through('UInt64', { low: 0, high: 0x200000, unsigned: true })).toBeNull();
    expect(through('DateTime', { low: 1, high: 0x200000, unsigned: true })).toBeNull();
    expect(through('Int64', { low: 0, high: 0x200000, unsigned: true })).toBeNull();
    expect(whole('UInt8', 256)).toBeNull();
    expect(whole('UInt16', 65536)).toBeNull();
    expect(whole('Int8', 300)).toBeNull();
    expect(metricValue({ stringValue: '1' }, DATATYPE.Double)).toBeNull();
    expect(metricValue({ doubleValue: 1 }, 16)).toBeNull();
  });

  it('below zero are read in their own width and carried on to 32 bits', () => {
    expect([whole('Int8', 0xff), whole('Int8', 0xffffffff)]).toEqual([-1, -1]);
    expect([whole('Int16', 0x8000), whole('Int16', 0xffff8000)]).toEqual([-32768, -32768]);
    expect(whole('Int32', 0x80000000)).toBe(-(2 ** 31));
  });

  it('without a type are taken where they can be only one thing', () => {
    expect(metricValue({ intValue: 7 }, undefined)).toBe(7);
    expect(metricValue({ intValue: 0xffffffff }, undefined)).toBeNull();
    expect(metricValue({ floatValue: 0.5 }, undefined)).toBe(0.5);
    expect(metricValue({}, undefined)).toBeNull();
  });

  it('written by rockhour are what the outside decoder reads', () => {
    const quality = writeProperties({ Quality: { datatype: DATATYPE.Int32, intValue: 500 } });
    const written = writePayload({
      ...{ timestamp: T0, seq: 0 },
      metrics: [
        { name: 'a', alias: 0, timestamp: T0, datatype: DATATYPE.Double, doubleValue: 0 },
        { name: 'b', alias: 1, datatype: DATATYPE.String, isNull: true, properties: quality },
      ],
    });
    const { metrics, seq, timestamp } = outside.decodePayload(written);
    expect([plain(seq), plain(timestamp)]).toEqual([0, T0]);
    expect(metrics).toMatchObject([
      { name: 'a', type: 'Double', value: 0 },
      { name: 'b', type: 'String', value: null, properties: { Quality: { value: 500 } } },
    ]);
    const read = readPayload(written);
    expect(typeof read === 'string' ? read : read.metrics!.map(qualityOf)).toEqual(['good', 'bad']);
  });
});

describe('hostile payloads', () => {
  const tag = (id: number, wire: number) => (id << 3) | wire;

  it('are refused by their length and their number of metrics before anything is built', () => {
    expect(readPayload(new Uint8Array(MOST_BYTES + 1))).toBe('too_large');
    const empty = Buffer.from([tag(2, 2), 0]);
    const many = (count: number) => Buffer.concat(Array.from({ length: count }, () => empty));
    expect(readPayload(many(MOST_METRICS + 1))).toBe('too_large');
    expect(readPayload(many(MOST_METRICS))).toHaveProperty('metrics');
  });

  it('of deep nesting, wrong wire types and cut-off lengths end as garbled', () => {
    const groups = Buffer.alloc(100_000, tag(9, 3));
    expect(readPayload(groups)).toBe('garbled');
    expect(readPayload(Buffer.from([tag(2, 2), 0xff, 0xff, 0xff, 0xff, 0x0f]))).toBe('garbled');
    expect(readPayload(Buffer.from([tag(1, 7)]))).toBe('garbled');
  });

  it('of random bytes never throw and are counted once each', () => {
    const { receive, counts, messages } = harness();
    const kinds = ['NBIRTH', 'NDATA', 'NDEATH', 'DBIRTH', 'DDATA', 'DDEATH'];
    const bytes = fc.uint8Array({ maxLength: 80 });
    let sent = 0;
    fc.assert(
      fc.property(fc.constantFrom(...kinds), bytes, (kind, payload) => {
        const device = kind.startsWith('D') ? '/Bed' : '';
        receive({ topic: `spBv1.0/Quarry/${kind}/PLC1${device}`, payload: Buffer.from(payload) });
        sent++;
        expect(messages()).toBe(sent);
        expect(counts.messages).toBe(sent);
      }),
      { numRuns: 500 },
    );
  });

  it('made of sound ones by flipping, cutting and doubling never throw and are counted once each', () => {
    const { receive, counts, messages, news } = harness();
    const edge = new EdgeNode();
    const sound: Sent[] = [
      edge.birth(T0, [{ name: 'Mode', type: 'String', value: 'charge' }]),
      edge.deviceBirth('Bed', T0, [
        { name: 'Bed/tt', type: 'Double', value: 300, alias: 12 },
        {
          ...{ name: 'Bed/e', type: 'Int64', value: -7 },
          properties: { Quality: { type: 'Int32', value: 192 } },
        },
      ]),
      edge.data('Bed', T0 + 1, [{ alias: 12, type: 'Double', value: 301 } as never]),
      edge.deviceDeath('Bed', T0 + 2),
      edge.death(),
    ];
    const change = fc.record({
      ...{ of: fc.nat(sound.length - 1), at: fc.double({ min: 0, max: 1, noNaN: true }) },
      ...{ byte: fc.nat(255), how: fc.constantFrom('set', 'cut', 'double', 'none') },
    });
    let sent = 0;
    fc.assert(
      fc.property(change, ({ of, at, byte, how }) => {
        const { topic, payload } = sound[of]!;
        const place = Math.min(payload.length - 1, Math.floor(at * payload.length));
        const changed = Buffer.from(payload);
        if (how === 'set') changed[place] = byte;
        const cut = how === 'cut' ? changed.subarray(0, place) : changed;
        receive({ topic, payload: how === 'double' ? Buffer.concat([cut, payload]) : cut });
        sent++;
        expect(messages()).toBe(sent);
        for (const row of news()) expect(row).toMatch(/^\w+@-?\d+=(-?[\d.e+-]+ good|NaN bad)$/);
      }),
      { numRuns: 800 },
    );
    expect(counts.messages).toBe(sent);
  });
});
