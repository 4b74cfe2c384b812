import { join } from 'node:path';
import { afterEach, expect, it } from 'vitest';
import { History } from '../../src/adapters/history/history.js';
import { AgeClock } from '../../src/daemon/ageClock.js';
import { temporaryFolder } from '../support/folders.js';
import { smallSite, smallUnit } from './site.js';

const HOUR = 3_600_000;
const DAY = 24 * HOUR;
const NOW = Date.UTC(2026, 5, 1);
const TEN_YEARS = 3650 * DAY;

const open: History[] = [];
afterEach(() => {
  for (const history of open.splice(0)) history.stop();
});

function historyOf(folder: string): History {
  const history = new History(join(folder, 'history.sqlite'), smallSite(null).store);
  history.start();
  open.push(history);
  return history;
}

/** By hand: this machine's clock, the newest reading, and time that is counted. */
function ages(history: Pick<History, 'kept' | 'keep'>, begin_ms = NOW) {
  const at = { clock: begin_ms, newest: begin_ms, counted: 0 };
  const failures: unknown[] = [];
  const clock = new AgeClock({
    history,
    clock: { now: () => at.clock, speed: 1, isWall: true },
    newest_ms: () => at.newest,
    counted: () => at.counted,
    failed: (thrown) => void failures.push(thrown),
  });
  const pass = (ms: number, every_ms = HOUR) => {
    for (let done = 0; done < ms; done += every_ms) {
      for (const key of ['clock', 'newest', 'counted'] as const) at[key] += every_ms;
      clock.now();
    }
  };
  return { at, clock, pass, failures };
}

it('follows the newest reading, no further than this machine, and nothing is old before the first', () => {
  const { at, clock, pass } = ages(historyOf(temporaryFolder('ages')));
  at.newest = Number.NEGATIVE_INFINITY;
  expect(clock.now()).toBe(Number.NEGATIVE_INFINITY);
  at.newest = NOW - 5000;
  expect(clock.now()).toBe(NOW - 5000);
  pass(3 * HOUR);
  expect(clock.now()).toBe(NOW + 3 * HOUR - 5000);
  at.newest = NOW + TEN_YEARS;
  at.counted += 5000;
  expect(clock.now()).toBe(NOW + 3 * HOUR);
});

it.each(['within a process', 'over a restart'])(
  'one unit and this machine ten years ahead, %s: nothing goes but a little early',
  (where) => {
    const folder = temporaryFolder('ages');
    const history = historyOf(folder);
    const unit = smallUnit('right');
    const told = [364, 363, 200, 10, 1].map((days) => new Date(NOW - days * DAY).toISOString());
    for (const time of told) {
      const estimate = {
        time,
        unit: 'right',
        revision: 0,
        mode: 'stand',
        quality: 'good',
      } as const;
      const one = { ...estimate, state_of_charge: 0.5, stores: {} };
      history.estimates.add(unit, one, { flow_kg_s: null, power_MW_el: null });
    }
    const rows = () => history.estimates.between('right', 0, 8.64e15, 100).map(({ time }) => time);
    let one = ages(history);
    one.clock.now();
    if (where === 'over a restart') one = ages(history, NOW + TEN_YEARS);
    one.at.clock = NOW + TEN_YEARS;
    one.at.newest = NOW + TEN_YEARS;
    one.clock.now();
    for (let h = 0; h < 12; h++) {
      one.pass(HOUR);
      history.retain(one.clock.now(), Number.POSITIVE_INFINITY);
    }
    // By the right clock half a day has passed: the oldest is not a year old by twice that.
    expect(one.clock.now()).toBe(NOW + DAY);
    expect(rows()).toEqual(told);
    one.at.clock = NOW + DAY / 2;
    one.at.newest = NOW + DAY / 2;
    expect(one.clock.now()).toBe(NOW + DAY / 2);
  },
);

it('catches up after an outage', () => {
  const history = historyOf(temporaryFolder('ages'));
  ages(history).clock.now();
  const after = ages(history, NOW + 10 * DAY);
  expect(after.clock.now()).toBe(NOW);
  after.pass(9 * DAY);
  expect(after.clock.now()).toBe(NOW + 18 * DAY);
  after.pass(DAY);
  expect(after.clock.now()).toBe(NOW + 20 * DAY);
  after.pass(DAY);
  expect(after.clock.now()).toBe(NOW + 21 * DAY);
});

it('goes on where it cannot be kept, as on a full disk, and says so', () => {
  const full = {
    kept: () => null,
    keep: () => {
      throw new Error('full');
    },
  };
  const { clock, pass, failures } = ages(full);
  pass(2 * HOUR);
  expect(clock.now()).toBe(NOW + 2 * HOUR);
  expect(failures.length).toBeGreaterThan(0);
});

it('is what a simulated plant tells, however fast', () => {
  let ms = NOW;
  const clock = new AgeClock({
    history: { kept: () => null, keep: () => undefined },
    clock: { now: () => ms, speed: 1000 },
    newest_ms: () => ms,
    counted: () => 0,
    failed: (thrown) => expect(thrown).toBeUndefined(),
  });
  clock.now();
  ms += 30 * DAY;
  expect(clock.now()).toBe(ms);
});
