import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  ALARM_ACTIONS,
  type CommandFault,
  inputOf,
  isFault,
  readCommand,
} from '../../../src/core/alarm/command.js';
import { covers, hasSubject, readId } from '../../../src/core/alarm/ids.js';
import { unitOf } from '../watch/units.js';

const SHELVE = { id: 'u/front_spread/hot', action: 'shelve', who: 'mara', hours: 2, why: 'dust' };
const read = (change: object) => readCommand({ ...SHELVE, ...change }, 8);

describe('a command about an alarm', () => {
  it('is read with its name and reason trimmed', () => {
    expect(read({ who: ' mara ', why: ' dust ' })).toEqual(SHELVE);
    const plain = { id: 'x', action: 'acknowledge', who: 'ole' };
    expect(readCommand(plain, 8)).toEqual({ ...plain, hours: null, why: '' });
  });

  it.each([
    ['no object', 7, null, /^an object/],
    ['a list', [SHELVE], null, /^an object/],
    ['a strange key', { ...SHELVE, hour: 2 }, 'hour', /^one of id, action, who, hours, why$/],
    ['no id', { ...SHELVE, id: undefined }, 'id', /^the id of an alarm/],
    ['another action', { ...SHELVE, action: 'silence' }, 'action', /^one of acknowledge, /],
    ['nobody', { ...SHELVE, who: '  ' }, 'who', /^a name of 1 to 64 characters$/],
    ['two lines of name', { ...SHELVE, who: 'a\nb' }, 'who', /^a name/],
    ['a shelf without reason', { ...SHELVE, why: '' }, 'why', /^the reason, 1 to 200 characters$/],
    ['no time', { ...SHELVE, hours: undefined }, 'hours', /^a number above 0 and at most 8$/],
    ['no hours at all', { ...SHELVE, hours: 0 }, 'hours', /^a number above 0/],
    ['too many hours', { ...SHELVE, hours: 8.01 }, 'hours', /at most 8$/],
    ['hours in words', { ...SHELVE, hours: '2' }, 'hours', /^a number/],
    ['hours of another action', { ...SHELVE, action: 'acknowledge' }, 'hours', /only shelve/],
  ])(
    'with %s is refused, naming the field, its value and what was expected',
    (_, value, field, expected) => {
      const fault = readCommand(value, 8) as CommandFault;
      expect(fault).toMatchObject({ code: 'wrong_value', field });
      expect(fault.expected).toMatch(expected);
      if (field !== null) {
        expect(fault.value).toEqual((value as Record<string, unknown>)[field] ?? null);
      }
    },
  );

  it('of whatever JSON is a command or a fault, and never throws', () => {
    fc.assert(
      fc.property(fc.jsonValue(), fc.constantFrom(...ALARM_ACTIONS), (value, action) => {
        const mixed = { ...SHELVE, action, ...(typeof value === 'object' ? value : {}) };
        for (const one of [value, mixed]) {
          const answer = readCommand(one, 8);
          if (!isFault(answer)) expect(() => inputOf(answer, 0)).not.toThrow();
          else expect(answer.expected).not.toBe('');
        }
      }),
      { seed: 2, numRuns: 300 },
    );
  });

  it('for a shelf ends so many hours from when it is given', () => {
    expect(inputOf(read({}) as never, 1000)).toEqual({
      ...{ kind: 'shelved', who: 'mara', why: 'dust', until_ms: 1000 + 7_200_000 },
    });
  });
});

describe('ids', () => {
  it('are taken apart at the first two slashes', () => {
    const id = { unit: 'u', kind: 'front_view_disagrees', subject: 'hot/axis' };
    expect(readId('u/front_view_disagrees/hot/axis')).toEqual(id);
    for (const none of ['u/none/hot', 'u/front_spread', 'u/front_spread/', '/front_spread/x', ''])
      expect(readId(none)).toBeNull();
  });

  it('are covered by their kind, kind and subject, or whole', () => {
    const id = readId('u/sensor_rejected/h1')!;
    expect(
      ['sensor_rejected', 'sensor_rejected/h1', 'u/sensor_rejected/h1'].every((e) => covers(e, id)),
    ).toBe(true);
    expect(['sensor_rejected/h', 'x/sensor_rejected/h1', 'u'].some((e) => covers(e, id))).toBe(
      false,
    );
  });

  it('have a subject that the unit knows', () => {
    const unit = unitOf();
    for (const name of ['one', 'hot', 'a', 'hot/a', 'hot_a_2'])
      expect(hasSubject(unit, name)).toBe(true);
    for (const name of ['warm', 'hot/b', 'hot_a_9']) expect(hasSubject(unit, name)).toBe(false);
  });
});
