import { describe, expect, it } from 'vitest';
import { rawToSi, voltageFinish } from '../../../src/core/scan/convert.js';
import { modeOfWord, openingOfWord } from '../../../src/core/scan/words.js';
import { channel, thermocouple } from '../../adapters/recording/small.js';

describe('raw readings in SI', () => {
  it('takes a mode for one of three and a valve as a share', () => {
    const mode = rawToSi(channel('mode', { kind: 'mode' }, 'mode'));
    expect([1, 0, -1, 0.5, 2].map(mode)).toEqual([1, 0, -1, Number.NaN, Number.NaN]);
    const valve = { kind: 'valve', opens: 'charge' } as const;
    expect(rawToSi(channel('v', valve, 'open'))(1)).toBe(1);
    expect(rawToSi(channel('v', valve, '%'))(50)).toBe(0.5);
  });

  it('knows the words of modes and valves', () => {
    expect(['charge', ' Stand ', 'DISCHARGE', 'on', 'constructor'].map(modeOfWord)).toEqual([
      1,
      0,
      -1,
      Number.NaN,
      Number.NaN,
    ]);
    expect(['open', 'closed', 'true', 'false', 'ajar'].map(openingOfWord)).toEqual([
      1,
      0,
      1,
      0,
      Number.NaN,
    ]);
  });

  it('refuses a unit that it does not know, and voltages that cannot be told', () => {
    expect(() => rawToSi(thermocouple('T', {}, 'Celsius'))).toThrow(RangeError);
    expect(() => voltageFinish({ channels: [thermocouple('T', {}, 'mV')] })).toThrow(
      /thermocouple_type/,
    );
    const lost = thermocouple('T', { thermocouple_type: 'K', cold_junction: 'gone' }, 'mV');
    expect(() => voltageFinish({ channels: [lost] })).toThrow(/cold_junction.*gone/);
    expect(voltageFinish({ channels: [thermocouple('T')] })).toBeNull();
  });

  it('leaves a voltage without its junction, and one of a burst, missing', () => {
    const T = thermocouple('T', { thermocouple_type: 'K', cold_junction: 'cj' }, 'mV');
    const cj = channel('cj', { kind: 'cold_junction', group: 'card' }, 'degC');
    const finish = voltageFinish({ channels: [T, cj] });
    const read = (mV: number, junction_K: number) => {
      const values = Float64Array.of(mV, junction_K);
      finish?.(values);
      return values[0];
    };
    expect(read(0, 298.15)).toBeCloseTo(298.15, 6);
    expect(read(1, Number.NaN)).toBeNaN();
    expect(read(1, 1000)).toBeNaN();
    expect(read(80, 298.15)).toBeNaN();
    expect(read(Number.NaN, 298.15)).toBeNaN();
  });
});
