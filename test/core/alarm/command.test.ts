import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  ALARM_ACTIONS,
  type CommandFault,
  inputOf,
  isFault,
  readCommand,
  staleFault,
} from '../../../src/core/alarm/command.js';
import { covers, readId, subjectsOf } from '../../../src/core/alarm/ids.js';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { EVENT_KINDS, type EventKind } from '../../../src/core/watch/event.js';
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
    ['a strange key', { ...SHELVE, hour: 2 }, 'hour', /^one of id, action, who, hours, why, time$/],
    ['no id', { ...SHELVE, id: undefined }, 'id', /^the id of an alarm/],
    ['another action', { ...SHELVE, action: 'silence' }, 'action', /^one of acknowledge, /],
    ['nobody', { ...SHELVE, who: '  ' }, 'who', /^a name of 1 to 64 characters$/],
    ['two lines of name', { ...SHELVE, who: 'a\nb' }, 'who', /^a name/],
    ['a name that turns itself round', { ...SHELVE, who: 'mara\u202Eelo' }, 'who', /^a name/],
    ['an invisible name', { ...SHELVE, who: '\u200B\u200B' }, 'who', /^a name/],
    ['a reason in two paragraphs', { ...SHELVE, why: 'a\u2029b' }, 'why', /^the reason/],
    ['a time without zone', { ...SHELVE, time: '2026-01-31T06:00:00' }, 'time', /^when the word/],
    ['a time that is none', { ...SHELVE, time: '2026-13-31T06:00:00Z' }, 'time', /^when the word/],
    ['a shelf without reason', { ...SHELVE, why: '' }, 'why', /^the reason, 1 to 200 characters$/],
    [
      'no time',
      { ...SHELVE, hours: undefined },
      'hours',
      /^a number from 1\/60 \(a minute\) to 8$/,
    ],
    ['no hours at all', { ...SHELVE, hours: 0 }, 'hours', /^a number from/],
    ['next to no hours', { ...SHELVE, hours: 1e-11 }, 'hours', /a minute/],
    ['too many hours', { ...SHELVE, hours: 8.01 }, 'hours', /to 8$/],
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

  it('takes a name in any writing, and a shelf of a minute', () => {
    for (const who of [
      '\u05DE\u05E8\u05D4',
      'Jos\u00E9',
      '\u0645\u06CC\u200C\u0631\u0627',
      '\u{1F9EF} team',
    ])
      expect(read({ who })).toMatchObject({ who });
    expect(read({ hours: 60 / 3600 })).toMatchObject({ hours: 1 / 60 });
  });

  it('that waited too long, or is about an occurrence nobody has seen, is stale', () => {
    const now_ms = Date.parse('2026-01-31T06:00:00Z');
    const stale = (action: string, time: string, since: string | null) => {
      const command = readCommand({ id: 'x', action, who: 'mara', why: 'w', time }, 8);
      if (isFault(command)) throw new Error(command.expected);
      const entry = since === null ? null : ({ state: 'unacknowledged', since } as const);
      const fault = staleFault(command, entry, now_ms);
      return fault && `${fault.code} ${fault.field} ${fault.expected}`;
    };
    const raised = '2026-01-31T05:58:00.000Z';
    expect(stale('acknowledge', '2026-01-31T07:57:59+02:00', raised)).toBe(
      'wrong_state time a time after 2026-01-31T05:58:00.000Z, since when it is shown: ' +
        'what was seen before is not this',
    );
    expect(stale('acknowledge', '2026-01-31T05:58:00Z', raised)).toBeNull();
    expect(stale('acknowledge', '2026-01-31T05:57:59Z', null)).toBeNull();
    expect(stale('out_of_service', '2026-01-31T05:57:59Z', raised)).toBeNull();
    expect(stale('out_of_service', '2026-01-31T05:54:59Z', null)).toBe(
      'wrong_value time a time at most 5 min before 2026-01-31T06:00:00.000Z',
    );
    expect(stale('reset', '2026-01-31T06:01:01Z', null)).toMatch(/at most 1 min after/);
    const silent = readCommand({ id: 'x', action: 'reset', who: 'mara' }, 8);
    expect(isFault(silent) || staleFault(silent, null, now_ms)).toBeNull();
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

  it('have a subject that fits their kind', () => {
    const gas = {
      id: 'hot_gas',
      role: { kind: 'gas_temperature', store: 'hot', end: 'charge_inlet' },
    };
    const flow = { id: 'flow', role: { kind: 'flow', sense: 'signed' } };
    const unit = { ...unitOf(), channels: [gas, flow] as unknown as UnitDefinition['channels'] };
    const of = (kind: EventKind) => subjectsOf(unit, kind, ['InfluxDB']).join(' ');
    expect(of('outlet_near_limit')).toBe('hot cold');
    expect(of('estimate_blind')).toBe('one');
    expect(of('string_flow_uneven')).toBe('hot/a cold/a');
    expect(of('sensor_rejected')).toBe(
      'hot hot_a_1 hot_a_2 hot_a_3 cold cold_a_1 cold_a_2 cold_a_3',
    );
    expect(of('gas_temperature_off')).toBe('hot_gas');
    expect(of('database_unreachable')).toBe('InfluxDB');
    for (const kind of EVENT_KINDS) expect(subjectsOf(unit, kind, ['x']), kind).not.toEqual([]);
  });
});
