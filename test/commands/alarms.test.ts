import { describe, expect, it } from 'vitest';
import { type AlarmOptions, chosenAction } from '../../src/commands/alarms.js';
import { figuresText, listText } from '../../src/commands/alarmText.js';
import { entryOf } from '../../src/core/alarm/entry.js';
import { alarmReport } from '../../src/core/alarm/report.js';
import { NORMAL } from '../../src/core/alarm/state.js';
import { stepAlarm } from '../../src/core/alarm/step.js';
import { RockhourError } from '../../src/errors.js';

const url = 'http://127.0.0.1:8080';
const WORD = { who: 'mara', why: 'dust' };

describe('what is asked for with rockhour alarms', () => {
  it.each<[Omit<AlarmOptions, 'url'>, string | null]>([
    [{}, null],
    [{ figures: true, from: 'x', unit: 'u' }, null],
    [{ acknowledge: 'x', who: 'mara' }, 'acknowledge'],
    [{ shelve: 'x', for: '2h', ...WORD }, 'shelve'],
    [{ outOfService: 'x', ...WORD }, 'out_of_service'],
    [{ returnToService: 'x', who: 'mara' }, 'return_to_service'],
  ])('%j is %s', (options, action) => {
    expect(chosenAction({ url, ...options })?.[2] ?? null).toBe(action);
  });

  it.each<[Omit<AlarmOptions, 'url'>, RegExp]>([
    [{ acknowledge: 'x' }, /--acknowledge needs --who/],
    [{ shelve: 'x', ...WORD }, /--shelve and --for go together/],
    [{ acknowledge: 'x', who: 'mara', for: '2h' }, /--shelve and --for go together/],
    [{ outOfService: 'x', who: 'mara' }, /--out-of-service needs --why/],
    [
      { shelve: 'x', unshelve: 'x', who: 'mara' },
      /--shelve and --unshelve cannot be given together/,
    ],
    [{ who: 'mara' }, /--who goes with what is done to an alarm/],
    [{ from: '2026-01-01T00:00:00Z' }, /--from and --to go with --figures/],
    [{ acknowledge: 'x', who: 'mara', figures: true }, /--figures does not go with --acknowledge/],
  ])('refuses %j in words', (options, words) => {
    const act = () => chosenAction({ url, ...options });
    expect(act).toThrow(RockhourError);
    expect(act).toThrow(words);
  });
});

describe('what it prints', () => {
  const id = { unit: 'u', kind: 'outlet_near_limit', subject: 'hot' } as const;
  const timing = { time_ms: 0, latching: false };
  const raised = stepAlarm(NORMAL, { kind: 'raised' }, timing).state;
  const shelf = { kind: 'shelved', ...WORD, until_ms: 7_200_000 } as const;
  const shelved = stepAlarm(raised, shelf, timing).state;

  it('says what to do about what is shown, and who holds back the rest until when', () => {
    const text = listText({
      standing: [entryOf(id, raised, null)],
      suppressed: [entryOf(id, shelved, null)],
    });
    expect(text.split('\n')).toEqual([
      'alarm, high, unacknowledged: u/outlet_near_limit/hot',
      expect.stringMatching(/^ {2}1970-01-01T00:00:00.000Z {2}/),
      expect.stringMatching(/^ {2}to do within 30 min: Lower the power or prepare the change-over/),
      expect.stringMatching(/^ {2}else: The discharge ends/),
      '',
      'Held back (1):',
      'shelved: u/outlet_near_limit/hot, stands, by mara until 1970-01-01T02:00:00.000Z: dust',
    ]);
    expect(listText({ standing: [], suppressed: [] })).toBe('Nothing stands.');
  });

  it('has the figures in lines and the most frequent alarms in a table', () => {
    const annunciations = Array.from({ length: 12 }, (_, i) => {
      return { id: 'u/outlet_near_limit/hot', time_ms: 10_000 * i, priority: 'high' as const };
    });
    const report = alarmReport({
      ...{ unit: 'u', from_ms: 0, to_ms: 86_400_000, annunciations, alerts: 3 },
      entries: [entryOf(id, shelved, null)],
    });
    const text = figuresText(report);
    expect(text).toContain('12 alarms (100.0 % high, 0.0 % medium, 0.0 % low), 3 alerts');
    expect(text).toContain('1 floods, 0.8 % of the time');
    expect(text).toContain('u/outlet_near_limit/hot (7 in a minute)');
    expect(text).toContain('held back now: 1 shelved, 0 by design, 0 out of service');
    expect(text).toMatch(/u\/outlet_near_limit\/hot +12 +100\.0 %$/);
  });
});
