import fc from 'fast-check';
import { afterEach, describe, expect, it } from 'vitest';
import type { JournalReading } from '../../../src/adapters/history/journal.js';
import { packBackup, unpackBackup } from '../../../src/adapters/history/unitBackup.js';
import { Backups } from '../../../src/daemon/backups.js';
import type { Core } from '../../../src/daemon/core.js';
import { runnerMaker } from '../../../src/daemon/makeRunners.js';
import { fakeCore } from '../fakeCore.js';
import { Rig, reading } from '../rewind/rig.js';
import { PERIOD_MS, smallSite, smallUnit } from '../site.js';

const START = Date.UTC(2026, 0, 5, 6);
const rigs: Rig[] = [];
afterEach(() => {
  for (const rig of rigs.splice(0)) rig.stop();
});

async function started(core: Core = fakeCore, units = [smallUnit('u'), smallUnit('v')]) {
  const rig = await new Rig({ core, units }).start();
  rigs.push(rig);
  const { journal, history, counters, rewinder } = rig;
  const backups = new Backups({
    ...{ site: 'Small site', version: '1', journal, history, counters, rewinder },
    clock: { now: () => rig.now_ms, speed: 1 },
    future_tolerance_ms: 300_000,
    fresh: (unit) => runnerMaker(smallSite(null, { units }), core)(unit),
  });
  return { rig, backups };
}

/** Scans `from` to `to` of a unit, each with every channel. */
function scans(from: number, to: number, unit = 'u', lift = 0): JournalReading[] {
  return Array.from({ length: to - from }, (_, n) => {
    const i = from + n;
    const at = (ms: number) => START + i * PERIOD_MS + ms;
    return [
      reading('a', at(100), 300 + i * 0.1 + lift),
      reading('b', at(200), 310 + Math.sin(i)),
      ...(i % 5 === 2 ? [reading('e', at(250), i)] : []),
      reading('c', at(300), 320 + i / 3),
    ];
  })
    .flat()
    .map((one) => ({ ...one, unit }));
}

const runnerOf = (rig: Rig, unit = 'u') => rig.runners.get(unit)!;
/** A backup may be of another journal: by which entry its state began is not known then. */
const withoutNumbers = (image: unknown): unknown => {
  const { clocks, ...rest } = image as { clocks: { begun: object } };
  return { ...rest, clocks: { ...clocks, begun: { ...clocks.begun, seq: 0 } } };
};
const imageOf = (rig: Rig, unit = 'u') => runnerOf(rig, unit).checkpoint()!.image;

describe('a backup that is put back', () => {
  it('is to the bit where the unit would be without, and no other unit is touched', async () => {
    const { rig, backups } = await started();
    await rig.take(scans(0, 40));
    await rig.take(scans(0, 40, 'v'));
    const file = backups.make(runnerOf(rig))!;
    const then = unpackBackup(file);
    await rig.take(scans(40, 130).slice(0, -1));
    const own = { image: imageOf(rig), seq: runnerOf(rig).seq };
    const other = imageOf(rig, 'v');
    const before = rig.estimates();
    const told = rig.told.length;
    const answer = await backups.restore(runnerOf(rig), file, 'ada');
    expect(answer).toMatchObject({ accepted: true, same_shape: true, reaches: true, lost: [] });
    expect({ image: imageOf(rig), seq: runnerOf(rig).seq }).toEqual({
      ...own,
      image: withoutNumbers(own.image),
    });
    expect(imageOf(rig, 'v')).toEqual(other);
    // Made again to the same: no estimate has another revision, nothing is told twice.
    expect(rig.estimates()).toEqual(before);
    expect(rig.told.length).toBe(told);
    const state_of = new Date(then.time_ms).toISOString();
    expect(rig.history.rewinds.latest('u')).toMatchObject({
      ...{ scans: 89, revised: 0, restored: { state_of, who: 'ada' } },
    });
    expect(rig.lines.some((line) => line.includes('by ada'))).toBe(true);
    // And goes on as it would have, also over a restart.
    const twin = await started();
    await twin.rig.take([...scans(0, 130)]);
    await rig.take(scans(0, 130).slice(-1));
    const states = [rig, twin.rig].map((one) => (imageOf(one) as { unit: unknown }).unit);
    expect(states[0]).toEqual(states[1]);
  });

  it('revises estimates of a state that was led astray', async () => {
    const { rig, backups } = await started();
    await rig.take(scans(0, 40));
    const file = backups.make(runnerOf(rig))!;
    await rig.take(scans(40, 80));
    const right = imageOf(rig);
    const estimates = rig.estimates();
    const { unit } = runnerOf(rig);
    // Another lineage: as if the unit had been started anew in between.
    const astray = runnerMaker(smallSite(null), fakeCore)(unit);
    for (const entry of rig.journal.read(0, 1e6).slice(30)) {
      astray.take(entry, 0);
      for (let step = astray.step(); step; step = astray.step()) {
        const { estimate } = step.step;
        const from_ms = Math.floor(Date.parse(estimate.time) / PERIOD_MS) * PERIOD_MS;
        const span = { from_ms, end_ms: from_ms + PERIOD_MS };
        rig.history.estimates.revise(unit, estimate, step.measured, span, false);
      }
    }
    runnerOf(rig).adopt(astray);
    expect(imageOf(rig)).not.toEqual(right);
    const answer = await backups.restore(runnerOf(rig), file, 'ada');
    expect(answer).toMatchObject({ accepted: true, record: { revision: 2, scans: 40 } });
    expect(imageOf(rig)).toEqual(withoutNumbers(right));
    const bare = (list: typeof estimates) =>
      list.slice(41).map(({ revision: _, dispatch: __, ...rest }) => rest);
    expect(bare(rig.estimates())).toEqual(bare(estimates));
  });

  it('goes to another machine, whose journal begins later: the time between is a gap', async () => {
    const { rig, backups } = await started();
    await rig.take(scans(0, 40));
    const file = backups.make(runnerOf(rig))!;
    const other = await started();
    other.rig.now_ms = START + 3 * 3_600_000;
    const fresh = await other.backups.restore(runnerOf(other.rig), file, 'ada');
    expect(fresh).toMatchObject({ accepted: true, reaches: false, record: { scans: 0 } });
    expect((imageOf(other.rig) as { unit: unknown }).unit).toEqual(
      (unpackBackup(file).image as { unit: unknown }).unit,
    );
    await other.rig.take(scans(60, 70));
    await rig.take(scans(60, 70));
    expect((imageOf(other.rig) as { unit: unknown }).unit).toEqual(
      (imageOf(rig) as { unit: unknown }).unit,
    );
    // A journal that has some of the time since: no estimate is made for what is not in it.
    const late = await started();
    await late.rig.take(scans(60, 70));
    const before = late.rig.estimates().length;
    expect(await late.backups.restore(runnerOf(late.rig), file, 'ada')).toMatchObject({
      ...{ accepted: true, reaches: false },
    });
    expect(late.rig.estimates().length).toBe(before);
    expect((imageOf(late.rig) as { unit: unknown }).unit).toEqual(
      (imageOf(rig) as { unit: unknown }).unit,
    );
  });
});

describe('a file that is of no use', () => {
  it('changes nothing and says what is wrong', async () => {
    const { rig, backups } = await started();
    await rig.take(scans(0, 20));
    const file = backups.make(runnerOf(rig))!;
    const good = unpackBackup(file);
    const before = imageOf(rig);
    const image = good.image as { unit: { version: number; state: object }; assembler: object };
    const nan = {
      ...image,
      unit: { ...image.unit, state: { ...image.unit.state, mix: Number.NaN } },
    };
    const cases: [Uint8Array, RegExp][] = [
      [Buffer.from('no'), /is no backup, or was cut off/],
      [packBackup({ ...good, unit: 'v' }), /is of unit v, not u/],
      [packBackup({ ...good, time_ms: good.time_ms + 9e8 }), /ahead of this machine's clock/],
      [packBackup({ ...good, time_ms: good.time_ms + 1 }), /its state is of another time/],
      [
        packBackup({ ...good, image: { ...image, assembler: {} } }),
        /cannot be used by this version/,
      ],
      [packBackup({ ...good, image: nan }), /finite state of charge/],
      [packBackup({ ...good, image: { ...image, shape: undefined } }), /does not tell/],
      [packBackup({ ...good, image: 3 }), /lacks image/],
    ];
    for (const [bad, words] of cases) {
      const answer = await backups.restore(runnerOf(rig), bad, 'ada');
      expect(answer).toMatchObject({ accepted: false, is: 'unusable' });
      expect(answer.accepted ? '' : answer.fault).toMatch(words);
    }
    expect(imageOf(rig)).toEqual(before);
    expect(rig.counters.get('restores_refused')).toBe(cases.length);
    expect(rig.history.rewinds.latest('u')).toBeNull();
  });

  it('is any that was cut or has a bit that is not as it was, unless it says the same', async () => {
    const { rig, backups } = await started();
    await rig.take(scans(0, 20));
    const file = backups.make(runnerOf(rig))!;
    const whole = unpackBackup(file);
    const read = (bytes: Uint8Array) => {
      try {
        return unpackBackup(bytes);
      } catch (thrown) {
        expect(thrown).toBeInstanceOf(RangeError);
        return null;
      }
    };
    fc.assert(
      fc.property(fc.nat(file.length - 1), (length) => {
        expect(read(file.subarray(0, length))).toBeNull();
      }),
      { numRuns: 300, seed: 1 },
    );
    let passed = 0;
    fc.assert(
      fc.property(fc.nat(file.length - 1), fc.nat(7), (at, bit) => {
        const flipped = Uint8Array.from(file);
        flipped[at]! ^= 1 << bit;
        const found = read(flipped);
        // A few bits of a gzip file mean nothing: in its head, and where its last block is filled up.
        if (found === null) return;
        passed++;
        expect(found).toEqual(whole);
      }),
      { numRuns: 1500, seed: 2 },
    );
    // Places are drawn more often near the ends.
    expect(passed).toBeLessThan(300);
  });
});
