import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import type { JournalReading } from '../../../src/adapters/history/journal.js';
import { damageTables } from '../damage.js';
import { PERIOD_MS } from '../site.js';
import { type Rig, reading, rigsOfTests } from './rig.js';

const START = Date.UTC(2026, 0, 5, 6);
const { rigs, started } = rigsOfTests();

const timeOf = (scan: number, ms: number) => START + scan * PERIOD_MS + ms;

function scans(from: number, to: number): JournalReading[] {
  return Array.from({ length: to - from }, (_, k) => from + k).flatMap((i) =>
    ['a', 'b', 'c'].map((id, c) => reading(id, timeOf(i, 100 + c), 300 + i + c)),
  );
}

/** Scans 0 to 89 with one reading that comes late, and what was told of them in the end. */
async function withLate(rig: Rig) {
  const isLate = ({ time_ms }: JournalReading) => time_ms === timeOf(50, 101);
  await rig.take(scans(0, 90).filter((one) => !isLate(one)));
  const arrival_ms = timeOf(89, 0) + 2.3 * 3_600_000;
  await rig.take(
    scans(50, 51)
      .filter(isLate)
      .map((one) => ({ ...one, arrival_ms })),
  );
  await rig.settle();
  return rig.estimates();
}

const file = (rig: Rig) => join(rig.folder, 'history.sqlite');

describe('a history that is damaged while units run', () => {
  it('has its estimates made again from the oldest state, to the last bit and with their revisions', async () => {
    const rig = await started();
    const before = await withLate(rig);
    expect(before.map(({ revision }) => revision)).toEqual([
      ...Array(50).fill(0),
      ...Array(40).fill(1),
    ]);
    const state = rig.runner.snapshot();
    damageTables(file(rig), 'estimates', 'profiles');
    await rig.take(scans(90, 91));
    expect(rig.setAside).toHaveLength(1);
    expect(rig.estimates()).toHaveLength(1);
    expect(rig.rewinder.words('u')).toMatch(/wait to be made again$/);
    await rig.settle();
    const after = rig.estimates();
    // The oldest state is of the first scan, and has it in it.
    expect(after.slice(0, -1)).toEqual(before.slice(1));
    expect(rig.counters.all()).toMatchObject({ estimates_remade: 89, rewinds: 1 });
    expect(rig.rewinder.words('u')).toMatch(
      /89 estimates that a damaged history had lost, from a saved state$/,
    );
    expect(rig.history.rewinds.latest('u')).toMatchObject({
      revised: 0,
      revision: 1,
      remade: { estimates: 89, afresh: false },
    });
    expect(rig.history.lostBefore('u')).toBeNull();
    await rig.take(scans(91, 92));
    rig.stop();
    const other = await started();
    await withLate(other);
    expect(state).toEqual(other.runner.snapshot());
    await other.take(scans(90, 92));
    expect(rig.runner.snapshot()).toEqual(other.runner.snapshot());
  });

  it('goes on with it after a kill', async () => {
    const rig = await started();
    const before = await withLate(rig);
    damageTables(file(rig), 'estimates');
    await rig.take(scans(90, 91));
    rig.stop(true);
    rigs.pop();
    const next = await started({ folder: rig.folder });
    await next.settle();
    expect(next.estimates().slice(0, -1)).toEqual(before.slice(1));
  });

  it('without any state makes them again by a unit begun anew, each with the next revision', async () => {
    const rig = await started();
    await withLate(rig);
    damageTables(file(rig), 'estimates', 'checkpoints', 'rewind_points');
    await rig.take(scans(90, 91));
    await rig.settle();
    expect(rig.estimates().map(({ revision }) => revision)).toEqual([
      ...[...Array(50).fill(1), ...Array(40).fill(2)],
      0,
    ]);
    expect(rig.history.rewinds.latest('u')).toMatchObject({
      remade: { estimates: 90, afresh: true },
    });
    expect(rig.counters.get('estimates_revised')).toBe(40 + 90);
  });

  it('takes late readings in again whose note is lost', async () => {
    const rig = await started();
    const before = await withLate(rig);
    damageTables(file(rig), 'estimates', 'late_readings');
    await rig.take(scans(90, 91));
    await rig.settle();
    const values = (list: typeof before) => list.map(({ state_of_charge }) => state_of_charge);
    expect(values(rig.estimates().slice(0, -1))).toEqual(values(before.slice(1)));
    // What was made again without it has the next revision once more.
    expect(rig.estimates().at(-2)!.revision).toBe(2);
    expect(rig.counters.all()).toMatchObject({ rewinds: 2, late_used: 2 });
  });

  it('is replaced where only a question meets the damage, which is answered from the fresh one', async () => {
    const rig = await started();
    const before = await withLate(rig);
    damageTables(file(rig), 'estimates');
    expect(rig.history.estimates.between('u', 0, 8e15, 1000)).toEqual([]);
    expect(rig.setAside).toHaveLength(1);
    expect([...rig.history.estimates.rows('u', 0, 8e15, ['state_of_charge'])]).toEqual([]);
    await rig.settle();
    expect(rig.estimates()).toEqual(before.slice(1));
    damageTables(file(rig), 'estimates');
    // Row by row: mended, though this answer cannot be begun again.
    const rows = rig.history.estimates.rows('u', 0, 8e15, ['state_of_charge']);
    expect(() => [...rows]).toThrow(/malformed/);
    expect(rig.setAside).toHaveLength(2);
  });

  it('keeps alarms and cursors, and raises anew what stands and was lost', async () => {
    const rig = await started();
    await rig.take(scans(0, 3));
    await rig.pass(120_000);
    expect(rig.history.alarms.active('u').map(({ id }) => id)).toEqual(['u/data_stale/unit']);
    rig.history.keep('a number', 7);
    damageTables(file(rig), 'estimates');
    rig.history.estimates.latest('u');
    expect(rig.history.kept('a number')).toBe(7);
    expect(rig.history.alarms.active('u')).toHaveLength(1);
    await rig.settle();
    damageTables(file(rig), 'estimates', 'alarms');
    rig.history.estimates.latest('u');
    expect(rig.history.alarms.active('u')).toEqual([]);
    await rig.settle();
    expect(rig.history.alarms.active('u')[0]!.message).toContain(
      'The damaged history had it; holds since',
    );
    expect(rig.told.at(-1)!.id).toBe('u/data_stale/unit');
  });
});
