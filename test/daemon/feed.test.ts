import { expect, test } from 'vitest';
import type { JournalEntry } from '../../src/adapters/history/journal.js';
import { Feed, PAGE, type UnitLine } from '../../src/daemon/feed.js';
import type { UnitRunner } from '../../src/daemon/unitRunner.js';
import { mulberry } from '../support/random.js';

const entry = (seq: number, unit: string): JournalEntry => ({
  ...{ kind: 'close', seq, unit, scan_index: seq, arrival_ms: 0 },
});

function feedOf(journal: readonly JournalEntry[], units: Readonly<Record<string, number>>) {
  const runners = Object.entries(units).map(([id, seq]) => ({ unit: { id }, seq }));
  const strays: number[] = [];
  let reads = 0;
  const feed = new Feed(
    runners as unknown as UnitRunner[],
    0,
    (seq, most) => {
      reads++;
      return journal.slice(seq, seq + most);
    },
    ({ seq }) => strays.push(seq),
  );
  return { feed, strays, reads: () => reads };
}

test.each([1, 2, 3, 4])(
  'gives each unit all of its own in order, whoever is slow, and holds little of it (seed %i)',
  (seed) => {
    const random = mulberry(seed);
    const names = ['calm', 'flooded', 'silent', 'stray', 'known'];
    const journal = Array.from({ length: 60_000 }, (_, i) => {
      const at = random();
      const name = at < 0.9 ? 'flooded' : at < 0.95 ? 'calm' : at < 0.97 ? 'known' : 'stray';
      return entry(i + 1, name);
    });
    const { feed, strays } = feedOf(journal, { calm: 0, flooded: 0, silent: 0, known: 30_000 });
    const taken: Record<string, number[]> = Object.fromEntries(names.map((name) => [name, []]));
    const take = (line: UnitLine, most: number) => {
      for (let n = 0; n < most; n++) {
        const next = feed.take(line);
        if (!next) return;
        taken[line.runner.unit.id]!.push(next.seq);
      }
    };
    let most = 0;
    while (feed.fill(journal.length) || feed.waiting > 0) {
      const held = feed.lines.reduce((sum, { length }) => sum + length, 0);
      most = Math.max(most, held);
      for (const line of feed.lines) {
        take(line, line.runner.unit.id === 'flooded' ? Math.floor(random() * 200) : 1000);
      }
    }
    const of = (unit: string, from = 0) =>
      journal.filter((one) => one.unit === unit && one.seq > from).map(({ seq }) => seq);
    expect(taken.flooded).toEqual(of('flooded'));
    expect(taken.calm).toEqual(of('calm'));
    expect(taken.known).toEqual(of('known', 30_000));
    expect(taken.silent).toEqual([]);
    expect(strays).toEqual(of('stray'));
    expect(most).toBeLessThan(6000);
  },
);

test('tells a unit that waits for its turn from units that are far behind', () => {
  const flood = Array.from({ length: 2000 }, (_, i) => entry(i + 1, 'flooded'));
  const { feed } = feedOf([...flood, entry(2001, 'calm')], { calm: 0, flooded: 0 });
  const [calm, flooded] = feed.lines;
  for (const line of feed.lines) line.mayStep = false;
  expect(feed.isAnyInStep).toBe(false);
  feed.fill(2000);
  expect(flooded!.length).toBe(PAGE);
  expect(feed.isAnyInStep).toBe(false);
  while (calm!.length === 0 && feed.fill(2001));
  expect(feed.isAnyInStep).toBe(true);
  feed.take(calm!);
  expect(feed.isAnyInStep).toBe(false);
  // It has closed a scan that is not worked off.
  calm!.mayStep = true;
  expect(feed.isAnyInStep).toBe(true);
  calm!.mayStep = false;
  // The flood is over: what is left of it is a scan's.
  while (feed.fill(2001) || feed.waiting > 90) feed.take(flooded!);
  expect(feed.isAnyInStep).toBe(true);
});

test('reads past a flood for a unit that has nothing to do', () => {
  const flood = Array.from({ length: 20_000 }, (_, i) => entry(i + 1, 'flooded'));
  const { feed } = feedOf([...flood, entry(20_001, 'calm')], { calm: 0, flooded: 0 });
  const [calm] = feed.lines;
  while (calm!.length === 0 && feed.fill(20_001));
  expect(feed.take(calm!)?.seq).toBe(20_001);
  expect(feed.waiting).toBe(20_000);
});

test('reads the journal of a single unit once', () => {
  const journal = Array.from({ length: 20_480 }, (_, i) => entry(i + 1, 'u'));
  const { feed, reads } = feedOf(journal, { u: 0 });
  while (feed.fill(journal.length) || feed.waiting > 0) {
    feed.take(feed.lines[0]!);
  }
  expect(reads()).toBe(40);
});
