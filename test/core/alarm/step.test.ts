import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  ALARM_STATES,
  type AlarmState,
  isForgettable,
  NORMAL,
  STATE_LETTERS,
} from '../../../src/core/alarm/state.js';
import { type AlarmInput, stepAlarm, TRANSITION_KINDS } from '../../../src/core/alarm/step.js';

const WHO = { who: 'mara', why: 'seen' };
const INPUTS = {
  raise: { kind: 'raised' },
  return: { kind: 'returned' },
  ack: { kind: 'acknowledged', ...WHO },
  reset: { kind: 'reset', ...WHO },
  shelve: { kind: 'shelved', ...WHO, until_ms: 1000 },
  unshelve: { kind: 'unshelved', ...WHO },
  wait: { kind: 'time' },
  suppress: { kind: 'suppressed' },
  release: { kind: 'released' },
  remove: { kind: 'removed', ...WHO },
  restore: { kind: 'restored', ...WHO },
} as const satisfies Record<string, AlarmInput>;
type Word = keyof typeof INPUTS;
const WORDS = Object.keys(INPUTS) as Word[];

const letter = ({ state }: AlarmState) => STATE_LETTERS[state];

/** Letters gone through by words that follow each other, one ms apart, from normal. */
function walk(words: string, latching = false): { path: string; alarm: AlarmState } {
  let alarm = NORMAL;
  let path = 'A';
  words.split(' ').forEach((word, i) => {
    alarm = stepAlarm(alarm, INPUTS[word as Word], { time_ms: i, latching }).state;
    path += letter(alarm);
  });
  return { path, alarm };
}

describe('the diagram of the standard', () => {
  it('has its nine states under its letters', () => {
    expect(ALARM_STATES.map((state) => STATE_LETTERS[state]).join('')).toBe('ABCDEFGHI');
  });

  it.each([
    ['raise ack return', 'ABCA', 'raised, acknowledged, returned'],
    ['raise return ack', 'ABDA', 'raised, returned, acknowledged'],
    ['raise return raise', 'ABDB', 'raised again before it was acknowledged'],
    ['raise ack return raise', 'ABCAB', 'raised again after all was over'],
    ['shelve unshelve', 'AGA', 'shelved while normal'],
    ['raise shelve unshelve', 'ABGB', 'shelved, condition stands: unacknowledged anew'],
    ['raise ack shelve unshelve', 'ABCGB', 'shelved though acknowledged: unacknowledged anew'],
    ['raise return shelve unshelve', 'ABDGA', 'shelved after its return: seen by who shelved it'],
    ['shelve raise unshelve', 'AGGB', 'raised on the shelf'],
    ['raise shelve return unshelve', 'ABGGA', 'returned on the shelf'],
    ['raise suppress release', 'ABHB', 'a rule came and went'],
    ['raise ack suppress release', 'ABCHB', 'a rule over what was acknowledged'],
    [
      'raise ack suppress return release',
      'ABCHHA',
      'returned under a rule after being acknowledged',
    ],
    ['raise suppress return release', 'ABHHD', 'returned under a rule before anybody saw it'],
    ['raise return suppress release', 'ABDHD', 'a rule over what nobody saw'],
    ['raise suppress return ack release', 'ABHHHA', 'acknowledged under the rule, returned'],
    ['raise suppress ack release', 'ABHHB', 'acknowledged under the rule, stands after it'],
    ['suppress raise return release', 'AHHHA', 'all of it under a rule: never shown'],
    ['suppress raise release', 'AHHB', 'a rule ends while the condition stands'],
    ['remove restore', 'AIA', 'out of service while normal'],
    ['raise remove restore', 'ABIB', 'out of service, condition stands'],
    ['raise ack remove restore', 'ABCIB', 'the same after acknowledgement'],
    ['raise return remove restore', 'ABDIA', 'out of service after its return'],
    ['remove raise return restore', 'AIIIA', 'comes and goes out of service'],
    ['shelve remove restore', 'AGIA', 'out of service outranks and ends a shelf'],
    ['raise suppress remove restore release', 'ABHIHB', 'a rule waits behind service'],
    ['raise suppress shelve unshelve release', 'ABHGHB', 'a rule waits behind a shelf'],
    ['raise shelve suppress release unshelve', 'ABGGGB', 'a rule came and went behind a shelf'],
    ['remove suppress restore release', 'AIIHA', 'a rule came out of service'],
  ])('%s: %s, %s', (words, path) => {
    expect(walk(words).path).toBe(path);
  });

  it.each([
    ['raise return ack reset', 'ABEFA', 'stays until acknowledged and reset'],
    ['raise ack return reset', 'ABCFA', 'the same, acknowledged first'],
    ['raise return raise', 'ABEB', 'raised again unacknowledged'],
    ['raise ack return raise', 'ABCFB', 'raised again acknowledged'],
    ['raise return ack raise ack return', 'ABEFBCF', 'raised again and latched again'],
    ['raise return shelve unshelve', 'ABEGE', 'a latch is not lost on a shelf'],
    ['raise ack return shelve unshelve', 'ABCFGE', 'nor an acknowledged one'],
    ['raise return suppress release', 'ABEHE', 'nor by a rule'],
    ['raise ack return suppress release', 'ABCFHE', 'nor an acknowledged one'],
    ['raise return remove restore', 'ABEIE', 'nor out of service'],
    ['raise ack return remove restore', 'ABCFIE', 'nor an acknowledged one'],
    ['shelve raise return unshelve', 'AGGGA', 'what was never shown does not latch'],
  ])('latching: %s: %s, %s', (words, path) => {
    expect(walk(words, true).path).toBe(path);
  });

  it('lets a shelf run out when its time has come, not before', () => {
    const { alarm } = walk('raise shelve');
    const at = (time_ms: number) =>
      stepAlarm(alarm, INPUTS.wait, { time_ms, latching: false }).transition;
    expect(at(999)).toBeNull();
    expect(at(1000)).toEqual({
      ...{ what: 'shelf_ran_out', time_ms: 1000, before: 'shelved', after: 'unacknowledged' },
      ...{ who: null, why: 'its time on the shelf ran out' },
    });
  });

  it('keeps the times of shelf and service, and moves the end of a shelf when shelved again', () => {
    const first = walk('raise shelve').alarm;
    expect(first.shelf).toEqual({ ...WHO, since_ms: 1, until_ms: 1000 });
    const longer = { kind: 'shelved', who: 'ole', why: 'parts', until_ms: 5000 } as const;
    const again = stepAlarm(first, longer, { time_ms: 7, latching: false }).state;
    expect(again).toMatchObject({ state: 'shelved', since_ms: 1, shelf: { until_ms: 5000 } });
    expect(walk('remove').alarm.service).toEqual({ ...WHO, since_ms: 0 });
  });

  it.each([
    ['ack', '', 'nothing of it is to be acknowledged'],
    ['ack', 'raise ack', 'it was acknowledged by mara'],
    ['ack', 'raise shelve', 'it is shelved'],
    ['ack', 'suppress raise', 'it is suppressed by design'],
    ['ack', 'raise remove', 'it is out of service'],
    ['reset', 'raise', 'its condition still stands'],
    ['reset', '', 'it is not latched'],
    ['unshelve', 'raise', 'it is not shelved'],
    ['restore', 'raise', 'it is not out of service'],
    ['remove', 'remove', 'it is out of service already'],
    ['shelve', 'remove', 'it is out of service'],
  ])('refuses to %s after "%s": %s', (word, words, reason) => {
    const alarm = words === '' ? NORMAL : walk(words).alarm;
    const step = stepAlarm(alarm, INPUTS[word as Word], { time_ms: 9, latching: false });
    expect(step).toEqual({ state: alarm, transition: null, refused: reason });
  });

  it('refuses to reset what nobody has acknowledged', () => {
    const { alarm } = walk('raise return', true);
    const { refused } = stepAlarm(alarm, INPUTS.reset, { time_ms: 9, latching: true });
    expect(refused).toBe('acknowledge it first');
  });

  it('wants a time, a name and an end that lies ahead', () => {
    const step = (input: AlarmInput, time_ms = 0) =>
      stepAlarm(NORMAL, input, { time_ms, latching: false });
    expect(() => step(INPUTS.raise, Number.NaN)).toThrow(/time_ms must be finite, got NaN/);
    expect(() => step({ ...INPUTS.ack, who: ' ' })).toThrow(/who must be the name/);
    expect(() => step(INPUTS.shelve, 1000)).toThrow(/finite time after 1000, got 1000/);
  });
});

/**
 * The same diagram told another way: a table of the arrows between A and F, and beside it the three
 * things that can hold an alarm back. Written from the standard's diagram, not from the code.
 */
const ARROWS: Record<string, Partial<Record<Word, string>>> = {
  A: { raise: 'B' },
  B: { return: 'D', ack: 'C' },
  C: { return: 'A' },
  D: { raise: 'B', ack: 'A' },
  E: { raise: 'B', ack: 'F' },
  F: { raise: 'B', reset: 'A' },
};
const LATCHING: typeof ARROWS = { ...ARROWS, B: { return: 'E', ack: 'C' }, C: { return: 'F' } };

interface Model {
  inner: string;
  stands: boolean;
  /** What a latching alarm comes back to; null: nothing latched. */
  isLatched: boolean;
  isUnseen: boolean;
  shelf: number | null;
  rule: boolean;
  service: boolean;
}

function outer(m: Model): string {
  if (m.service) return 'I';
  if (m.shelf !== null) return 'G';
  return m.rule ? 'H' : m.inner;
}

function modelStep(m: Model, word: Word, time: number, latching: boolean): Model {
  const next = { ...m };
  const wasHeld = outer(m).match(/[GHI]/) !== null;
  if (word === 'raise') next.stands = true;
  if (word === 'return') next.stands = false;
  if (word === 'suppress') next.rule = true;
  if (word === 'release') next.rule = false;
  if (word === 'shelve' && !m.service) next.shelf = 1000;
  if (word === 'unshelve' || (word === 'wait' && m.shelf !== null && time >= m.shelf))
    next.shelf = null;
  if (word === 'remove') {
    next.service = true;
    next.shelf = null;
  }
  if (word === 'restore') next.service = false;
  if (word === 'ack' && outer(m) === 'H') next.isUnseen = false;
  const isHeld = outer(next).match(/[GHI]/) !== null;
  if (!wasHeld && !isHeld) {
    const isNew = word === 'raise' ? !m.stands : word !== 'return' || m.stands;
    if (isNew) next.inner = (latching ? LATCHING : ARROWS)[m.inner]?.[word] ?? m.inner;
    if ('EF'.includes(next.inner)) next.isLatched = true;
    if (next.inner === 'A' || next.inner === 'D') next.isLatched = false;
  }
  if (!wasHeld && isHeld) next.isUnseen = outer(next) === 'H' && 'BD'.includes(m.inner);
  // Whoever shelves it or takes it out of service has seen it.
  if (isHeld && word !== 'raise' && 'GI'.includes(outer(next))) next.isUnseen = false;
  if (wasHeld && !isHeld) {
    next.inner = next.stands ? 'B' : next.isLatched ? 'E' : next.isUnseen ? 'D' : 'A';
    next.isUnseen = false;
  }
  return next;
}

describe('any course of events', () => {
  const courses = fc.array(fc.constantFrom(...WORDS), { minLength: 1, maxLength: 60 });

  it('ends where an independent model of the diagram ends, with every arrow walked', () => {
    const walked = new Set<string>();
    const named = new Set<string>();
    fc.assert(
      fc.property(courses, fc.boolean(), (words, latching) => {
        let alarm = NORMAL;
        let model: Model = {
          ...{ inner: 'A', stands: false, isLatched: false, isUnseen: false },
          ...{ shelf: null, rule: false, service: false },
        };
        words.forEach((word, i) => {
          // Late enough for shelves to run out in half of the waits.
          const time_ms = word === 'wait' && i % 2 === 0 ? 2000 : Math.min(i, 999);
          const { state, transition } = stepAlarm(alarm, INPUTS[word], { time_ms, latching });
          model = modelStep(model, word, time_ms, latching);
          // An expectation for each of 100,000 steps would take seconds.
          const isSame = letter(state) === outer(model) && state.active === model.stands;
          if (!isSame) throw new Error(`${words.slice(0, i + 1).join(' ')}: ${letter(state)}`);
          const { before, after } = transition ?? { before: alarm.state, after: alarm.state };
          if (before !== alarm.state || after !== state.state)
            throw new Error(`${before} ${after}`);
          if (transition !== null) {
            walked.add(letter(alarm) + letter(state));
            named.add(transition.what);
          }
          alarm = state;
        });
      }),
      { seed: 11, numRuns: 4000 },
    );
    expect([...named].sort()).toEqual([...TRANSITION_KINDS].sort());
    const inner = ['AB', 'BC', 'BD', 'CA', 'DA', 'DB', 'BE', 'CF', 'EF', 'FA', 'EB', 'FB'];
    const held = [...'ABCDEF'].flatMap((from) => [...'GHI'].map((to) => from + to));
    const back = [...'GHI'].flatMap((from) => [...'ABE'].map((to) => from + to));
    const among = ['GH', 'HG', 'GI', 'HI', 'IH', 'HD'];
    const expected = [...inner, ...held, ...back, ...among];
    expect(expected.filter((arrow) => !walked.has(arrow))).toEqual([]);
    // And nothing else, but for what comes and goes within a state that holds it back.
    const still = ['GG', 'HH', 'II'];
    expect([...walked].filter((arrow) => ![...expected, ...still].includes(arrow))).toEqual([]);
  });

  it('never loses a standing condition: let go of everything, it is unacknowledged or acknowledged', () => {
    fc.assert(
      fc.property(courses, (words) => {
        const { alarm } = walk([...words, 'restore', 'unshelve', 'release'].join(' '));
        expect(['BC'.includes(letter(alarm)), letter(alarm)]).toEqual([
          alarm.active,
          letter(alarm),
        ]);
        if (isForgettable(alarm)) expect(alarm.active).toBe(false);
      }),
      { seed: 3, numRuns: 500 },
    );
  });

  it('is plain data: it survives JSON to the last key', () => {
    const { alarm } = walk('raise shelve');
    expect(JSON.parse(JSON.stringify(alarm))).toEqual(alarm);
  });
});
