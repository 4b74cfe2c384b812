import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  makeRoute,
  type PayloadFault,
  type PayloadReading,
  parsePayload,
  type Route,
} from '../../../src/adapters/mqtt/payload.js';
import type { ChannelDefinition, ChannelRole } from '../../../src/core/definitions.js';
import { arrayMessage, valueMessage } from './schema.js';

function channel(id: string, role: ChannelRole, raw_unit = 'K'): ChannelDefinition {
  const reporting = { kind: 'periodic' } as const;
  return { id, role, reporting, raw_unit, thermocouple_type: null, cold_junction: null };
}

function route(payload: 'value' | 'array', ...channels: ChannelDefinition[]): Route {
  const ids = channels.map(({ id }) => id);
  return makeRoute({ unit: 'u', topic: 't', payload, channels: ids }, channels);
}

const ambient: ChannelRole = { kind: 'ambient_temperature' };
const VALUE = route('value', channel('a', ambient));
const ARRAY = route('array', ...['a', 'b', 'c'].map((id) => channel(id, ambient)));
const ARRIVAL = 1_700_000_000_000;

function parse(
  on: Route,
  content: unknown,
): { readings: PayloadReading[]; faults: PayloadFault[] } {
  const faults: PayloadFault[] = [];
  const text = typeof content === 'string' ? content : JSON.stringify(content);
  const readings = parsePayload(on, text, ARRIVAL, (fault) => faults.push(fault));
  return { readings, faults };
}

const values = (on: Route, content: unknown) => parse(on, content).readings.map((r) => r.value);

describe('a message with one value', () => {
  it('gives a reading with the source time, in SI units', () => {
    const content = { time: '2026-03-01T10:00:00.250+02:00', value: 25, quality: 'uncertain' };
    const { readings, faults } = parse(route('value', channel('a', ambient, 'degC')), content);
    expect(faults).toEqual([]);
    expect(readings).toMatchObject([
      { time_ms: Date.UTC(2026, 2, 1, 8, 0, 0, 250), value: 298.15, quality: 'uncertain' },
    ]);
  });

  it.each([
    ['no JSON', '{"time": 1, "value": 2'],
    ['an empty payload', ''],
    ['a bare number', '450.1'],
    ['an array', '[1]'],
    ['null', 'null'],
    ['a number as text', '{"time": 1, "value": "450.1"}'],
    ['NaN', '{"time": 1, "value": NaN}'],
    ['an infinity', '{"time": 1, "value": 1e999}'],
    ['no value', '{"time": 1}'],
    ['a boolean', '{"time": 1, "value": true}'],
    ['a time without an offset', '{"time": "2026-03-01T10:00:00", "value": 1}'],
    ['the 30th of February', '{"time": "2026-02-30T10:00:00Z", "value": 1}'],
    ['a time of null', '{"time": null, "value": 1}'],
  ])('that is %s is malformed and gives nothing', (_, text) => {
    expect(parse(VALUE, text)).toEqual({ readings: [], faults: ['malformed'] });
  });

  it('of null is a missing value, one of bad quality has none, and an unknown quality is bad', () => {
    const missing = parse(VALUE, { time: 1, value: null, quality: 'good' });
    expect(missing.faults).toEqual(['missing_value']);
    expect(missing.readings).toMatchObject([{ value: Number.NaN, quality: 'bad' }]);
    expect(values(VALUE, { time: 1, value: 5, quality: 'bad' })).toEqual([Number.NaN]);
    const unknown = parse(VALUE, { time: 1, value: 5, quality: 'GOOD' });
    expect(unknown.faults).toEqual(['unknown_quality']);
    expect(unknown.readings).toMatchObject([{ value: Number.NaN, quality: 'bad' }]);
  });

  it('without a time takes that of its arrival, and is counted', () => {
    const { readings, faults } = parse(VALUE, { value: 5 });
    expect(faults).toEqual(['without_time']);
    expect(readings).toMatchObject([{ time_ms: ARRIVAL, value: 5, quality: 'good' }]);
  });

  it('may name a mode or a valve position in words', () => {
    const mode = route('value', channel('m', { kind: 'mode' }, '1'));
    const inWords = ['charge', 'stand', 'Discharge', 1, 0, -1];
    expect(inWords.map((value) => values(mode, { time: 1, value })[0])).toEqual([
      1, 0, -1, 1, 0, -1,
    ]);
    for (const value of ['loading', 2, 0.5, true]) {
      expect(parse(mode, { time: 1, value }).faults).toEqual(['malformed']);
    }
    const valve = route('value', channel('v', { kind: 'valve', opens: 'charge' }, '1'));
    const positions = ['open', 'closed', true, false, 0.25];
    expect(positions.map((value) => values(valve, { time: 1, value })[0])).toEqual([
      1, 0, 1, 0, 0.25,
    ]);
  });
});

describe('a message with the values of a string', () => {
  it('gives one reading per thermocouple, with one quality for all or one for each', () => {
    const one = parse(ARRAY, { time: 7, values: [1, 2, 3], quality: 'good' }).readings;
    expect(one.map((r) => [r.channel.id, r.time_ms, r.value])).toEqual([
      ['a', 7, 1],
      ['b', 7, 2],
      ['c', 7, 3],
    ]);
    const each = { time: 7, values: [1, 2, 3], quality: ['good', 'bad', 'uncertain'] };
    expect(values(ARRAY, each)).toEqual([1, Number.NaN, 3]);
  });

  it('with an entry that is no number loses that one only', () => {
    const { readings, faults } = parse(ARRAY, { time: 7, values: [1, 'open', null] });
    expect(readings.map((r) => r.value)).toEqual([1, Number.NaN, Number.NaN]);
    expect(faults).toEqual(['bad_element', 'missing_value']);
  });

  it('with another number of entries is refused, since none can be told from the next', () => {
    for (const content of [
      { time: 7, values: [1, 2] },
      { time: 7, values: [1, 2, 3, 4] },
      { time: 7, values: [1, 2, 3], quality: ['good'] },
    ]) {
      expect(parse(ARRAY, content)).toEqual({ readings: [], faults: ['wrong_length'] });
    }
  });
});

const oneOf = (...choices: unknown[]) => fc.constantFrom(...choices);
const number = fc.oneof(fc.double({ noNaN: true, noDefaultInfinity: true }), fc.integer());
const junk = fc.oneof(fc.jsonValue(), oneOf('', 'NaN', '1', true, [], {}));
const time = fc.oneof(
  fc
    .date({ noInvalidDate: true, min: new Date(0), max: new Date('9999-12-31') })
    .map((d) => d.toISOString()),
  fc.integer({ min: -8.64e15, max: 8.64e15 }),
  number,
  oneOf('2026-02-29T00:00:00Z', '2024-02-29T23:59:59.1234567+14:00', '2026-01-01T00:00Z'),
  oneOf('0050-06-30T00:00:00-00:30', '2026-01-01T00:00:60Z', '2026-01-01T24:00:00Z', 9e15),
  oneOf('2026-13-01T00:00:00Z', '2026-01-01 00:00:00Z', '2026-01-01T00:00:00+25:00', '1 Jan 2026'),
  junk,
);
const quality = fc.oneof(oneOf('good', 'uncertain', 'bad', 'Good', null), junk);
const maybe = { requiredKeys: [] as [] };
const key = { value: fc.oneof(number, junk), time, quality };
const valueInput = fc.oneof(fc.record(key, maybe), junk);
const arrayInput = fc.oneof(
  fc.record(
    {
      time,
      values: fc.oneof(
        fc.array(fc.oneof(number, number, junk), { minLength: 2, maxLength: 4 }),
        junk,
      ),
      quality: fc.oneof(quality, fc.array(quality, { minLength: 2, maxLength: 4 })),
    },
    maybe,
  ),
  junk,
);

/** What the schema makes of a message, as readings: [time, value or NaN, quality]. */
function bySchema(content: unknown, isArray: boolean): unknown[] {
  if (!isArray) {
    const found = valueMessage.safeParse(content);
    if (!found.success) return [];
    return [reading(found.data.time, found.data.value, found.data.quality)];
  }
  const found = arrayMessage(3).safeParse(content);
  if (!found.success) return [];
  const { quality: stated } = found.data;
  return found.data.values.map((value, i) =>
    reading(found.data.time, value, (Array.isArray(stated) ? stated[i] : stated) ?? 'bad'),
  );
}

function reading(time_ms: number | undefined, value: number | null, stated: string): unknown[] {
  const isBad = value === null || stated === 'bad';
  return [(time_ms ?? ARRIVAL) + 0, isBad ? Number.NaN : value + 0, isBad ? 'bad' : stated];
}

const asTuples = (readings: readonly PayloadReading[]) =>
  readings.map((r) => [r.time_ms + 0, r.value + 0, r.quality]);

describe('the hand-written check', () => {
  it('agrees with the schema on messages with one value', () => {
    fc.assert(
      fc.property(valueInput, (content) => {
        const plain: unknown = JSON.parse(JSON.stringify(content));
        expect(asTuples(parse(VALUE, plain).readings)).toEqual(bySchema(plain, false));
      }),
      { seed: 11, numRuns: 5000 },
    );
  });

  it('agrees with the schema on messages with the values of a string', () => {
    fc.assert(
      fc.property(arrayInput, (content) => {
        const plain: unknown = JSON.parse(JSON.stringify(content));
        const { readings, faults } = parse(ARRAY, plain);
        expect(asTuples(readings)).toEqual(bySchema(plain, true));
        if (readings.length === 0) expect(faults).toHaveLength(1);
      }),
      { seed: 12, numRuns: 5000 },
    );
  });

  it('takes a good share of the random input, so that agreement means something', () => {
    const sample = fc.sample(valueInput, { seed: 11, numRuns: 5000 });
    const taken = sample.filter((content) => parse(VALUE, content as object).readings.length > 0);
    expect(taken.length).toBeGreaterThan(500);
    expect(taken.length).toBeLessThan(4500);
  });
});
