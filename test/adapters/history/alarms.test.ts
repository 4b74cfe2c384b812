import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { CONFIGURATION } from '../../../src/adapters/history/alarms.js';
import { History } from '../../../src/adapters/history/history.js';
import { HISTORY_SCHEMA } from '../../../src/adapters/history/schema.js';
import type { AlarmCommand } from '../../../src/core/alarm/command.js';
import type { Mode } from '../../../src/core/definitions.js';
import type { EventKind, WatchEvent } from '../../../src/core/watch/event.js';
import { KIND_CLASSES } from '../../../src/core/watch/kinds.js';
import { temporaryFolder } from '../../support/folders.js';
import { makeOlder } from './older.js';

const T = Date.UTC(2026, 0, 31);
const H = 3_600_000;
const STORE = {
  folder: '.',
  keep_readings_days: 30,
  keep_estimates_days: 365,
  thin_after_days: 30,
  thin_to_s: 600,
  checkpoint_every_s: 600,
};

function opened(
  rules?: ConstructorParameters<typeof History>[2],
  folder = temporaryFolder('alarms'),
) {
  const history = new History(join(folder, 'history.sqlite'), STORE, rules);
  history.start();
  const { events, alarms } = history;
  const raise = (kind: EventKind, time_ms: number, subject = 'hot', transition = 'raised') =>
    events.add({
      ...{ id: `u/${kind}/${subject}`, unit: 'u', kind, ...KIND_CLASSES[kind], subject },
      ...{ time: new Date(time_ms).toISOString(), value: 1, limit: 2, message: 'it is so' },
      transition: transition as WatchEvent['transition'],
    });
  const giveBack = (kind: EventKind, time_ms: number, subject?: string) =>
    raise(kind, time_ms, subject, 'returned');
  const say = (action: AlarmCommand['action'], id: string, now_ms: number, hours = 2) =>
    alarms.command({ id, action, who: 'mara', hours, why: 'because' }, now_ms);
  const states = () => alarms.entries().map(({ id, state }) => `${id} ${state}`);
  const walked = () =>
    alarms.transitions({}, 0, 1e15, 1e6).map((one) => `${one.what} ${one.before} ${one.after}`);
  return { history, folder, events, alarms, raise, giveBack, say, states, walked };
}

describe('alarms in the history', () => {
  it('keep every transition with time, who and why, newest first', () => {
    const { alarms, raise, giveBack, say } = opened();
    raise('front_spread', T);
    say('acknowledge', 'u/front_spread/hot', T + 1000);
    giveBack('front_spread', T + 2000);
    const [last, word, first] = alarms.transitions({ unit: 'u' }, T, T + 9000, 9);
    expect(first).toEqual({
      ...{ id: 'u/front_spread/hot', unit: 'u', kind: 'front_spread' },
      ...{ time: '2026-01-31T00:00:00.000Z', what: 'raised', who: null, why: '' },
      ...{ before: 'normal', after: 'unacknowledged' },
    });
    expect(word).toMatchObject({ what: 'acknowledged', who: 'mara', why: 'because' });
    expect(last).toMatchObject({ what: 'returned', before: 'acknowledged', after: 'normal' });
    expect(alarms.transitions({ unit: 'other' }, 0, 1e15, 9)).toEqual([]);
    expect(alarms.transitions({ id: 'u/front_spread/hot' }, T, T, 9)).toHaveLength(1);
  });

  it('are counted with the priority that they were raised with, not with that of their kind', () => {
    const { events, alarms, giveBack, say } = opened();
    const raised = (time_ms: number, priority: WatchEvent['priority']) =>
      events.add({
        ...{ id: 'u/outlet_near_limit/hot', unit: 'u', kind: 'outlet_near_limit', subject: 'hot' },
        ...{ class: 'alarm', priority, transition: 'raised', value: 1, limit: 2, message: 'early' },
        time: new Date(time_ms).toISOString(),
      });
    raised(T, 'medium');
    giveBack('outlet_near_limit', T + 1000);
    say('acknowledge', 'u/outlet_near_limit/hot', T + 2000);
    raised(T + 3000, 'high');
    expect(alarms.annunciations('u', 'alarm', T, T + H)).toEqual([
      { id: 'u/outlet_near_limit/hot', time_ms: T, priority: 'medium' },
      { id: 'u/outlet_near_limit/hot', time_ms: T + 3000, priority: 'high' },
    ]);
  });

  it('come back from a file to the last key, shelves and service included', () => {
    const first = opened();
    first.raise('front_spread', T);
    first.raise('valve_leaks', T);
    first.raise('gas_lost', T, 'u');
    first.say('shelve', 'u/front_spread/hot', T + 1000, 3);
    first.say('out_of_service', 'u/valve_leaks/hot', T + 1000);
    first.say('acknowledge', 'u/gas_lost/u', T + 1000);
    const before = first.alarms.entries();
    first.history.stop();
    const { alarms, history } = opened(undefined, first.folder);
    expect(alarms.entries()).toEqual(before);
    expect(alarms.entry('u/front_spread/hot')).toMatchObject({
      ...{ state: 'shelved', letter: 'G', active: true },
      shelved: { by: 'mara', why: 'because', until: new Date(T + 1000 + 3 * H).toISOString() },
    });
    expect(alarms.passTime(T + 3 * H)).toEqual([]);
    expect(alarms.passTime(T + 1000 + 3 * H)).toEqual(['u']);
    expect(alarms.entry('u/front_spread/hot')).toMatchObject({ state: 'unacknowledged' });
    history.stop();
  });

  it('have their time on the shelf run out by the source time of a scan, too', () => {
    const { alarms, raise, say, states } = opened();
    raise('front_spread', T);
    say('shelve', 'u/front_spread/hot', T, 1);
    expect(alarms.scan('u', 'stand', T + H - 1)).toBe(false);
    expect(alarms.scan('other', 'stand', T + 2 * H)).toBe(false);
    expect(alarms.scan('u', 'stand', T + H)).toBe(true);
    expect(states()).toEqual(['u/front_spread/hot unacknowledged']);
  });

  it('can be shelved or out of service before they are raised, and are known by their id', () => {
    const { alarms, raise, say } = opened();
    expect(say('shelve', 'u/front_spread/hot', T)).toBeNull();
    expect(alarms.entry('u/front_spread/hot')).toMatchObject({ state: 'shelved', subject: 'hot' });
    raise('front_spread', T + 1);
    expect(alarms.entry('u/front_spread/hot')).toMatchObject({ active: true, message: 'it is so' });
    expect(say('unshelve', 'u/front_spread/hot', T + 2)).toBeNull();
    expect(alarms.entry('u/front_spread/hot')).toMatchObject({ state: 'unacknowledged' });
    expect(say('shelve', 'nothing', T)).toBe('there is no such alarm or alert');
    expect(say('return_to_service', 'u/front_spread/hot', T)).toBe('it is not out of service');
  });

  it('do not change by a word that the disk does not take, and say so', () => {
    const { folder, raise, say, states } = opened();
    raise('front_spread', T);
    const lock = new SQLite(join(folder, 'history.sqlite'));
    lock.exec('BEGIN IMMEDIATE');
    const word = () => say('acknowledge', 'u/front_spread/hot', T + 1);
    expect(word).toThrow(/^recording what mara did to u\/front_spread\/hot: .*SQLITE_BUSY/);
    expect(states()).toEqual(['u/front_spread/hot unacknowledged']);
    lock.exec('ROLLBACK');
    expect(word()).toBeNull();
    lock.close();
  });

  it('acknowledged twice keep the first name, and no second transition', () => {
    const { alarms, raise, walked } = opened();
    raise('front_spread', T);
    const word = (who: string) =>
      alarms.command(
        { id: 'u/front_spread/hot', action: 'acknowledge', who, hours: null, why: '' },
        T + 1,
      );
    expect([word('mara'), word('ole')]).toEqual([null, null]);
    expect(alarms.entries()).toMatchObject([{ acknowledged_by: 'mara' }]);
    expect(walked()).toHaveLength(2);
  });
});

describe('rules of the design', () => {
  it('let the alarm of a discharge that is over return at once, and never bring it back later', () => {
    const { alarms, raise, giveBack, say, states } = opened();
    const stands = 'u/outlet_near_limit/hot';
    alarms.scan('u', 'discharge', T);
    raise('outlet_near_limit', T);
    expect(states()).toEqual([`${stands} unacknowledged`]);
    expect(alarms.scan('u', 'stand', T + 1000)).toBe(false);
    giveBack('outlet_near_limit', T + 2000);
    expect(states()).toEqual([`${stands} returned_unacknowledged`]);
    expect(alarms.scan('u', 'charge', T + 3000)).toBe(false);
    expect(alarms.scan('u', 'discharge', T + 8 * H)).toBe(false);
    expect(states()).toEqual([`${stands} returned_unacknowledged`]);
    expect(say('acknowledge', stands, T + 8 * H)).toBeNull();
    expect(states()).toEqual([]);
  });

  it('that an older version took it off the list by leave it to be acknowledged there', () => {
    const { folder, history, raise } = opened();
    raise('outlet_near_limit', T);
    history.stop();
    const file = new SQLite(join(folder, 'history.sqlite'));
    file.exec(`UPDATE alarms SET state = 'suppressed_by_design', alarm = json_set(alarm,
      '$.state', 'suppressed_by_design', '$.active', json('false'), '$.unseen', json('true'),
      '$.suppressed', json('true'))`);
    file.close();
    const { alarms, say, states } = opened(undefined, folder);
    expect(alarms.scan('u', 'stand', T + 1000)).toBe(false);
    expect(say('acknowledge', 'u/outlet_near_limit/hot', T + 2000)).toBeNull();
    alarms.scan('u', 'discharge', T + 3000);
    expect(states()).toEqual([]);
  });

  it('hold back what comes up under them, and forget what goes again', () => {
    const { alarms, raise, giveBack, states, walked } = opened();
    alarms.scan('u', 'stand', T);
    raise('string_flow_uneven', T + 1);
    expect(states()).toEqual(['u/string_flow_uneven/hot suppressed_by_design']);
    giveBack('string_flow_uneven', T + 2);
    expect(states()).toEqual([]);
    expect(walked().reverse()).toEqual([
      'suppressed_by_design normal suppressed_by_design',
      'raised suppressed_by_design suppressed_by_design',
      'returned suppressed_by_design suppressed_by_design',
    ]);
    raise('string_flow_uneven', T + 3);
    alarms.scan('u', 'charge', T + 4);
    expect(states()).toEqual(['u/string_flow_uneven/hot unacknowledged']);
  });

  it('leave alone what stands already, so that no start makes them new', () => {
    const { alarms, raise, say, states } = opened();
    alarms.scan('u', 'charge', T);
    raise('string_flow_uneven', T);
    say('acknowledge', 'u/string_flow_uneven/hot', T + 1);
    for (let k = 0; k < 6; k++) alarms.scan('u', k % 2 ? 'charge' : 'stand', T + 2 + k);
    expect(states()).toEqual(['u/string_flow_uneven/hot acknowledged']);
  });

  it('are not known before the first scan of a process, and hold nothing back then', () => {
    const { raise, states } = opened();
    raise('outlet_near_limit', T);
    expect(states()).toEqual(['u/outlet_near_limit/hot unacknowledged']);
  });
});

describe('what is told outside', () => {
  /** What a receiver finds behind its cursor. */
  function listening(rules?: Parameters<typeof opened>[0]) {
    const made = opened(rules);
    const queue = made.history.eventQueue('r');
    queue.start();
    const told = () =>
      queue.read(99).map(({ event }) => `${event.transition} ${event.again ?? '-'}`);
    return { ...made, queue, told };
  }
  const ID = 'u/front_spread/hot';

  it('is what is shown anew, by raise, shelf or service, with when it came up', () => {
    const { alarms, raise, say, queue, told } = listening();
    raise('front_spread', T);
    say('acknowledge', ID, T + 1);
    say('shelve', ID, T + 2);
    say('unshelve', ID, T + 3);
    say('shelve', ID, T + 4, 1);
    alarms.passTime(T + 4 + H);
    say('out_of_service', ID, T + 5 + H);
    say('return_to_service', ID, T + 6 + H);
    expect(told()).toEqual([
      ...['raised -', 'raised unshelved', 'raised shelf_ran_out', 'raised returned_to_service'],
    ]);
    const at = (ms: number) => new Date(ms).toISOString();
    expect(queue.read(9)[1]!.event).toMatchObject({
      ...{ id: ID, again: 'unshelved', time: at(T + 3), raised_at: at(T) },
      message: `Shown again, as it was taken off the shelf; raised at 2026-01-31 00:00:00 UTC: it is so`,
    });
  });

  it('is what a rule had held back, once the rule has ended', () => {
    const { alarms, raise, told } = listening();
    alarms.scan('u', 'stand', T);
    raise('string_flow_uneven', T + 1);
    expect(told()).toEqual([]);
    alarms.scan('u', 'charge', T + 2);
    expect(told()).toEqual(['raised released']);
  });

  it('is the return of what was told, also while it is held back, and of nothing else', () => {
    const { raise, giveBack, say, told } = listening();
    raise('front_spread', T);
    say('shelve', ID, T + 1);
    giveBack('front_spread', T + 2);
    expect(told()).toEqual(['raised -', 'returned -']);
    // On the shelf still: nobody is told of it, nor that it goes again.
    raise('front_spread', T + 3);
    giveBack('front_spread', T + 4);
    expect(told()).toHaveLength(2);
    raise('front_spread', T + 5);
    say('unshelve', ID, T + 6);
    giveBack('front_spread', T + 7);
    expect(told().slice(2)).toEqual(['raised unshelved', 'returned -']);
  });

  it('of an older file waits on for each receiver, and what stood there is told to return', () => {
    const { folder, history, raise } = opened();
    raise('front_spread', T);
    history.stop();
    const old = new SQLite(join(folder, 'history.sqlite'));
    makeOlder(old, 'tellings');
    old.exec(`UPDATE alarms SET alarm = json_remove(alarm, '$.told');
      INSERT INTO cursors VALUES ('events to r', 0), ('events to s', 40)`);
    old.close();
    const again = opened(undefined, folder);
    const [r, s] = ['r', 's'].map((name) => again.history.eventQueue(name));
    expect([r!.backlog, s!.backlog]).toEqual([1, 0]);
    again.giveBack('front_spread', T + 1);
    expect(r!.read(9).map(({ event }) => event.transition)).toEqual(['raised', 'returned']);
    expect(s!.read(9).map(({ event }) => event.transition)).toEqual(['returned']);
  });
});

describe('what the configuration says', () => {
  const named = { latching: [], out_of_service: ['sensor_rejected/hot_a_1', 'gas_lost'] };

  it('takes out of service what it names, once it is raised, and back when it names it no more', () => {
    const first = opened(named);
    first.raise('sensor_rejected', T, 'hot_a_1');
    first.raise('sensor_rejected', T, 'hot_a_2');
    expect(first.states()).toEqual([
      'u/sensor_rejected/hot_a_1 out_of_service',
      'u/sensor_rejected/hot_a_2 unacknowledged',
    ]);
    expect(first.alarms.entries()[0]!.out_of_service!.by).toBe(CONFIGURATION);
    first.history.stop();
    const again = opened({ latching: [], out_of_service: [] }, first.folder);
    again.alarms.start(T + 5);
    expect(again.states()).toEqual([
      'u/sensor_rejected/hot_a_1 unacknowledged',
      'u/sensor_rejected/hot_a_2 unacknowledged',
    ]);
    again.history.stop();
    const third = opened(named, first.folder);
    third.alarms.start(T + 6);
    expect(third.states()[0]).toBe('u/sensor_rejected/hot_a_1 out_of_service');
  });

  it('is not overruled by a person`s word: what it names is returned to service there', () => {
    const { raise, say, states } = opened(named);
    raise('gas_lost', T, 'u');
    expect(say('return_to_service', 'u/gas_lost/u', T + 1)).toMatch(
      /of the configuration: take it/,
    );
    expect(states()).toEqual(['u/gas_lost/u out_of_service']);
  });

  it('does not take back what a person took out of service', () => {
    const { alarms, raise, say, states } = opened();
    raise('valve_leaks', T);
    say('out_of_service', 'u/valve_leaks/hot', T + 1);
    alarms.start(T + 2);
    expect(states()).toEqual(['u/valve_leaks/hot out_of_service']);
  });

  it('makes kinds latch: they stay until acknowledged and reset', () => {
    const { raise, giveBack, say, states } = opened({
      latching: ['bed_settled'],
      out_of_service: [],
    });
    raise('bed_settled', T);
    giveBack('bed_settled', T + 1);
    expect(states()).toEqual(['u/bed_settled/hot latched_unacknowledged']);
    expect(say('reset', 'u/bed_settled/hot', T + 2)).toBe('acknowledge it first');
    say('acknowledge', 'u/bed_settled/hot', T + 3);
    expect(say('reset', 'u/bed_settled/hot', T + 4)).toBeNull();
    expect(states()).toEqual([]);
  });
});

describe('any course of scans, events and words', () => {
  const KINDS = ['outlet_near_limit', 'string_flow_uneven', 'bed_settled', 'gas_lost'] as const;
  const ACTIONS = [
    'acknowledge',
    'shelve',
    'unshelve',
    'out_of_service',
    'return_to_service',
    'reset',
  ];
  const rules = { latching: ['bed_settled' as const], out_of_service: ['gas_lost'] };
  const scan = fc.record({
    op: fc.constant('scan' as const),
    mode: fc.constantFrom<Mode>('charge', 'stand', 'discharge'),
    events: fc.array(fc.tuple(fc.constantFrom(...KINDS), fc.boolean()), { maxLength: 3 }),
  });
  const word = fc.record({
    op: fc.constant('word' as const),
    action: fc.constantFrom(...(ACTIONS as AlarmCommand['action'][])),
    kind: fc.constantFrom(...KINDS),
  });

  type Step = typeof scan | typeof word extends fc.Arbitrary<infer S> ? S : never;

  /** Runs it through one history, or through one that is closed and opened again after each step. */
  function run(steps: readonly Step[], again: boolean) {
    let made = opened(rules);
    steps.forEach((step, i) => {
      const now_ms = T + i * 0.4 * H;
      if (step.op === 'word') made.say(step.action, `u/${step.kind}/hot`, now_ms, 1);
      else {
        made.history.write(() => {
          made.alarms.scan('u', step.mode, now_ms);
          for (const [kind, up] of step.events)
            made.raise(kind, now_ms, 'hot', up ? 'raised' : 'returned');
        });
      }
      if (!again) return;
      made.history.stop();
      made = opened(rules, made.folder);
      made.alarms.start(now_ms);
    });
    const end = {
      entries: made.alarms.entries(),
      walked: made.alarms.transitions({}, 0, 1e15, 1e6),
    };
    made.history.stop();
    return end;
  }

  it('ends the same, transition by transition, where the process ended after every one', () => {
    fc.assert(
      fc.property(fc.array(fc.oneof(scan, word), { minLength: 1, maxLength: 25 }), (steps) => {
        const end = run(steps, false);
        expect(run(steps, true)).toEqual(end);
        // Each alarm's transitions join: one begins where the one before has ended. What a rule held
        // back without a condition is forgotten, and begins from normal again.
        const last = new Map<string, string>();
        for (const { id, before, after } of [...end.walked].reverse()) {
          const ended = last.get(id) ?? 'normal';
          if (ended !== 'suppressed_by_design' || before !== 'normal') expect(before).toBe(ended);
          last.set(id, after!);
        }
      }),
      { seed: 7, numRuns: 25 },
    );
  });
});

describe('a storm of 10,000 flapping conditions', () => {
  it('loses no event, and has one entry per id', () => {
    const { history, alarms } = opened();
    const IDS = 500;
    const FLAPS = 20;
    const started = performance.now();
    history.write(() => {
      for (let n = 0; n < IDS * FLAPS; n++) {
        const [id, flap] = [n % IDS, Math.floor(n / IDS)];
        const subject = `t${id}`;
        history.events.add({
          ...{ id: `u/sensor_rejected/${subject}`, unit: 'u', kind: 'sensor_rejected', subject },
          ...{ class: 'alert', priority: 'low', value: null, limit: null, message: 'flaps' },
          time: new Date(T + 1000 * flap).toISOString(),
          transition: flap % 2 === 0 ? 'raised' : 'returned',
        });
      }
    });
    expect(performance.now() - started).toBeLessThan(10_000);
    expect(history.events.between('u', T, T + 1e6, 1e6)).toHaveLength(10_000);
    expect(alarms.transitions({}, T, T + 1e6, 1e6)).toHaveLength(10_000);
    expect(alarms.entries()).toHaveLength(IDS);
    expect(new Set(alarms.entries().map(({ state }) => state))).toEqual(
      new Set(['returned_unacknowledged']),
    );
    // Half of them raise: each is one that was shown anew.
    expect(alarms.annunciations('u', 'alert', T, T + 1e6)).toHaveLength(5_000);
    expect(alarms.annunciations('u', 'alarm', T, T + 1e6)).toEqual([]);
  });
});

describe('a history of an older version', () => {
  it('keeps what stood, who acknowledged it, and what had happened', () => {
    const folder = temporaryFolder('alarms');
    const file = join(folder, 'history.sqlite');
    const old = new SQLite(file);
    for (const step of HISTORY_SCHEMA.slice(0, 2)) old.exec(step);
    old.pragma('user_version = 2');
    const event = (kind: EventKind, subject: string, transition: string, at: number) => ({
      ...{
        id: `u/${kind}/${subject}`,
        unit: 'u',
        kind,
        ...KIND_CLASSES[kind],
        subject,
        transition,
      },
      ...{ time: new Date(T + at).toISOString(), value: 1.5, limit: 1.3, message: 'wide' },
    });
    const stood = [
      [event('front_spread', 'hot', 'raised', 123), 'acknowledged', 'mara'],
      [event('sensor_rejected', 'h_1', 'raised', 7), 'unacknowledged', null],
      [event('front_view_disagrees', 'hot/a', 'raised', 9), 'returned_unacknowledged', null],
    ] as const;
    stood.forEach(([one, state, by], i) => {
      const json = JSON.stringify(one);
      old.prepare('INSERT INTO standing VALUES (?, ?, ?, ?, ?)').run(one.id, 'u', state, by, json);
      old
        .prepare('INSERT INTO events VALUES (?, ?, ?, ?, ?, ?)')
        .run(i + 1, 'u', one.id, Date.parse(one.time), 'raised', json);
    });
    old
      .prepare('INSERT INTO acknowledgements (id, who, time) VALUES (?, ?, ?)')
      .run('u/front_spread/hot', 'mara', T + 500);
    old.close();
    const { alarms, giveBack, say, states } = opened(undefined, folder);
    expect(alarms.entries().sort((a, b) => a.id.localeCompare(b.id))).toMatchObject([
      {
        ...{ id: 'u/front_spread/hot', state: 'acknowledged', acknowledged_by: 'mara' },
        ...{ active: true, since: new Date(T + 500).toISOString(), message: 'wide', value: 1.5 },
      },
      { id: 'u/front_view_disagrees/hot/a', state: 'returned_unacknowledged', active: false },
      { id: 'u/sensor_rejected/h_1', state: 'unacknowledged', active: true },
    ]);
    expect(alarms.transitions({}, T, T + 1000, 9)).toMatchObject([
      { what: 'acknowledged', who: 'mara', kind: 'front_spread', unit: 'u' },
      { what: 'raised', kind: 'front_spread', before: null, after: 'unacknowledged' },
      { what: 'raised', kind: 'front_view_disagrees' },
      { what: 'raised', kind: 'sensor_rejected' },
    ]);
    giveBack('front_spread', T + 2000);
    say('acknowledge', 'u/front_view_disagrees/hot/a', T + 2000);
    expect(states()).toEqual(['u/sensor_rejected/h_1 unacknowledged']);
  });
});
