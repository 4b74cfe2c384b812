import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { OperationDefinition } from '../../../src/core/definitions.js';
import { commandOf, type Piece, type RunningBefore } from '../../../src/core/plan/command.js';
import { energyBetween } from '../../../src/core/plan/course.js';
import type { Ceiling, Leg } from '../../../src/core/plan/leg.js';
import { unitOf } from '../track/plants.js';

const plain = unitOf();
const operation: OperationDefinition = {
  ramp_W_s: { charge: 100, discharge: 50 },
  start: {
    warm: { time_s: 300, energy_J: 3e6 },
    cold: { time_s: 900, energy_J: 13.5e6 },
    cold_after_s: 7200,
  },
  change_over_s: 600,
};
/** Charges with 20 to 200 kW and discharges with 15 to 90 kW. */
const unit = unitOf({ limits: { ...plain.limits, operation } });
const STAND = -unit.machine.auxiliary_standing_W;
const HOUR = 3600;

const warm: RunningBefore = { mode: 'stand', power_W: 0, stood_s: 600, last: 'discharge' };
const running: RunningBefore = { mode: 'discharge', power_W: 60e3, stood_s: 0, last: 'discharge' };
const discharge = (power_kW: number, from_s: number, to_s: number): Leg => ({
  ...{ mode: 'discharge', power_W: power_kW * 1e3, from_s, to_s },
});
const charge = (power_kW: number, from_s: number, to_s: number): Leg => ({
  ...{ mode: 'charge', power_W: power_kW * 1e3, from_s, to_s },
});
const stand = (from_s: number, to_s: number): Leg => ({ mode: 'stand', power_W: 0, from_s, to_s });
const ceiling = (from_s: number, to_s: number, most: Partial<Ceiling> = {}): Ceiling => ({
  ...{ from_s, to_s, charge_max_W: 200e3, discharge_max_W: 90e3, cause: 'connection' },
  ...most,
});

/** Pieces as [from, to, purpose, power at both ends in kW, leg]. */
function brief(pieces: readonly Piece[]) {
  return pieces.map(({ from_s, to_s, purpose, power0_W, power1_W, leg }) => [
    ...[from_s, to_s, purpose],
    ...[power0_W / 1e3, power1_W / 1e3, leg],
  ]);
}
const S = STAND / 1e3;

describe('a command by hand', () => {
  it('starts ahead of a leg where the unit stands long enough', () => {
    // Ready at 3600 s; 60 kW at 50 W/s take 1200 s up, and down after the end.
    const { pieces, unmet } = commandOf(unit, [discharge(60, 3600, 9000)], [], warm, 12_000);
    expect(brief(pieces)).toEqual([
      [0, 3300, 'stand', S, S, -1],
      [3300, 3600, 'start_up', -10, -10, -1],
      [3600, 4800, 'ramp', 0, 60, 0],
      [4800, 9000, 'run', 60, 60, 0],
      [9000, 10_200, 'ramp', 60, 0, 0],
      [10_200, 12_000, 'stand', S, S, -1],
    ]);
    expect(unmet).toEqual([]);
  });

  it('begins a leg late where there is no time ahead of it', () => {
    const { pieces, unmet } = commandOf(unit, [discharge(60, 100, 9000)], [], warm, 9000);
    expect(brief(pieces).slice(0, 3)).toEqual([
      [0, 300, 'start_up', -10, -10, -1],
      [300, 1500, 'ramp', 0, 60, 0],
      [1500, 9000, 'run', 60, 60, 0],
    ]);
    expect(unmet).toEqual([{ leg: 0, cause: 'start_up', from_s: 100, to_s: 300, missing_W: 60e3 }]);
  });

  it('starts ahead of a leg within one that stands, as in a gap', () => {
    const end = 9000;
    const legs = [charge(100, 0, 3600), stand(3600, 7200), charge(100, 7200, end)];
    const before: RunningBefore = { mode: 'charge', power_W: -100e3, stood_s: 0, last: 'charge' };
    const told = commandOf(unit, legs, [], before, end);
    expect(brief(told.pieces)).toEqual([
      [0, 3600, 'run', -100, -100, 0],
      [3600, 4600, 'ramp', -100, 0, 0],
      [4600, 6900, 'stand', S, S, 1],
      [6900, 7200, 'start_up', -10, -10, -1],
      [7200, 8200, 'ramp', 0, -100, 2],
      [8200, 9000, 'run', -100, -100, 2],
    ]);
    expect(told.unmet).toEqual([]);
    const gap = commandOf(unit, [legs[0]!, legs[2]!], [], before, end);
    const powers = (pieces: readonly Piece[]) => brief(pieces).map((row) => row.slice(0, 5));
    expect(powers(gap.pieces)).toEqual(powers(told.pieces));
  });

  it('starts cold after a long stand, counted from when the unit came to stand', () => {
    const at = (stood_s: number, from_s: number) =>
      commandOf(unit, [discharge(60, from_s, 20_000)], [], { ...warm, stood_s }, 20_000).pieces;
    const startOf = (pieces: readonly Piece[]) => pieces.find((p) => p.purpose === 'start_up')!;
    // 7200 s are not longer than 7200 s.
    expect(startOf(at(3600, 3600))).toMatchObject({ from_s: 3300, to_s: 3600 });
    const cold = { from_s: 2701, to_s: 3601, power0_W: -15e3, power1_W: -15e3 };
    expect(startOf(at(3600, 3601))).toMatchObject(cold);
    expect(startOf(at(Number.POSITIVE_INFINITY, 0))).toMatchObject({ from_s: 0, to_s: 900 });
  });

  it('changes over between directions, and starts again', () => {
    // Down from 60 kW until 1200 s, over until 1800 s, up at 2100 s.
    const { pieces, unmet } = commandOf(unit, [charge(100, 0, 9000)], [], running, 9000);
    expect(brief(pieces)).toEqual([
      [0, 1200, 'ramp', 60, 0, -1],
      [1200, 1800, 'change_over', S, S, -1],
      [1800, 2100, 'start_up', -10, -10, -1],
      [2100, 3100, 'ramp', 0, -100, 0],
      [3100, 9000, 'run', -100, -100, 0],
    ]);
    const late = { leg: 0, cause: 'change_over', from_s: 0, to_s: 2100, missing_W: 100e3 };
    expect(unmet).toEqual([late]);
  });

  it('counts what a unit has stood already as part of the change-over', () => {
    const readyAt = (stood_s: number) => {
      const command = commandOf(unit, [charge(100, 0, 9000)], [], { ...warm, stood_s }, 9000);
      return [command.pieces.find((p) => p.mode === 'charge')!.from_s, command.unmet[0]!.cause];
    };
    expect(readyAt(0)).toEqual([900, 'change_over']);
    expect(readyAt(200)).toEqual([700, 'change_over']);
    expect(readyAt(600)).toEqual([300, 'start_up']);
    expect(readyAt(5000)).toEqual([300, 'start_up']);
  });

  it('does not start a unit that could not be ready before its leg ends', () => {
    const legs = [discharge(60, 0, 250), charge(100, 4000, 9000)];
    const { pieces, unmet } = commandOf(unit, legs, [], warm, 9000);
    expect(pieces.filter((p) => p.mode === 'discharge')).toEqual([]);
    expect(brief(pieces).slice(0, 3)).toEqual([
      [0, 250, 'stand', S, S, 0],
      [250, 3100, 'stand', S, S, -1],
      [3100, 3700, 'change_over', S, S, -1],
    ]);
    const whole = { leg: 0, cause: 'start_up', from_s: 0, to_s: 250, missing_W: 60e3 };
    expect(unmet).toEqual([whole]);
    // Where the next leg goes on in that direction the start is worth while, late for both.
    const on = commandOf(unit, [legs[0]!, discharge(40, 250, 9000)], [], warm, 9000);
    expect(on.pieces[0]).toMatchObject({ purpose: 'start_up', to_s: 300 });
    expect(on.unmet).toEqual([
      whole,
      { leg: 1, cause: 'start_up', from_s: 250, to_s: 300, missing_W: 40e3 },
    ]);
  });

  it('ramps at the edge between legs of one direction without a stand', () => {
    const legs = [discharge(60, 0, 3600), discharge(30, 3600, 7200), discharge(80, 7200, 9000)];
    const { pieces, unmet } = commandOf(unit, legs, [], running, 9000);
    expect(brief(pieces)).toEqual([
      [0, 3600, 'run', 60, 60, 0],
      [3600, 4200, 'ramp', 60, 30, 1],
      [4200, 7200, 'run', 30, 30, 1],
      [7200, 8200, 'ramp', 30, 80, 2],
      [8200, 9000, 'run', 80, 80, 2],
    ]);
    expect(unmet).toEqual([]);
  });

  it('cuts power above the greatest, and cannot run one below the least', () => {
    const most = commandOf(unit, [discharge(100, 0, HOUR)], [], running, HOUR);
    expect(most.pieces.at(-1)).toMatchObject({ power1_W: 90e3, purpose: 'run' });
    const above = { cause: 'above_greatest_power', from_s: 0, to_s: HOUR, missing_W: 10e3 };
    expect(most.unmet).toEqual([{ leg: 0, ...above }]);
    const least = commandOf(unit, [discharge(14, 2000, HOUR)], [], running, 2 * HOUR);
    expect(least.pieces.filter((p) => p.purpose === 'run')).toEqual([]);
    const below = { cause: 'below_least_power', from_s: 2000, to_s: HOUR, missing_W: 14e3 };
    expect(least.unmet).toEqual([{ leg: 0, ...below }]);
    expect(commandOf(unit, [discharge(15, 0, HOUR)], [], running, HOUR).unmet).toEqual([]);
  });

  it('is below a ceiling that begins inside a leg when it begins, and rises once it has ended', () => {
    const window = ceiling(3600, 7200, { discharge_max_W: 30e3 });
    const { pieces, unmet } = commandOf(unit, [discharge(60, 0, 9000)], [window], running, 9000);
    expect(brief(pieces)).toEqual([
      [0, 3000, 'run', 60, 60, 0],
      [3000, 3600, 'ramp', 60, 30, 0],
      [3600, 7200, 'run', 30, 30, 0],
      [7200, 7800, 'ramp', 30, 60, 0],
      [7800, 9000, 'run', 60, 60, 0],
    ]);
    expect(unmet).toEqual([
      { leg: 0, cause: 'connection', from_s: 3000, to_s: 3600, missing_W: 15e3 },
      { leg: 0, cause: 'connection', from_s: 3600, to_s: 7200, missing_W: 30e3 },
    ]);
  });

  it('stands through an outage and starts again after it, not within it', () => {
    const out = ceiling(3600, 7200, { charge_max_W: 0, discharge_max_W: 0, cause: 'outage' });
    const { pieces, unmet } = commandOf(unit, [discharge(60, 0, 12_000)], [out], running, 12_000);
    expect(brief(pieces)).toEqual([
      [0, 2400, 'run', 60, 60, 0],
      [2400, 3600, 'ramp', 60, 0, 0],
      [3600, 7200, 'stand', S, S, 0],
      [7200, 7500, 'start_up', -10, -10, -1],
      [7500, 8700, 'ramp', 0, 60, 0],
      [8700, 12_000, 'run', 60, 60, 0],
    ]);
    expect(unmet).toEqual([
      { leg: 0, cause: 'outage', from_s: 2400, to_s: 3600, missing_W: 30e3 },
      { leg: 0, cause: 'outage', from_s: 3600, to_s: 7200, missing_W: 60e3 },
      { leg: 0, cause: 'outage', from_s: 7200, to_s: 7500, missing_W: 60e3 },
    ]);
    // A window of the connection that shuts off the export alone lets the start-up be made in it.
    const shut = ceiling(3600, 7200, { discharge_max_W: 10e3 });
    const ahead = commandOf(unit, [discharge(60, 0, 12_000)], [shut], running, 12_000);
    expect(brief(ahead.pieces)).toContainEqual([6900, 7200, 'start_up', -10, -10, -1]);
    expect(ahead.unmet.at(-1)).toMatchObject({ from_s: 3600, to_s: 7200, missing_W: 60e3 });
  });

  it('makes no start-up while less may be taken than it draws', () => {
    // 10 kW are drawn; 8 kW may be taken until 5000 s.
    const little = ceiling(0, 5000, { charge_max_W: 8e3 });
    const { pieces, unmet } = commandOf(unit, [discharge(60, 3600, 9000)], [little], warm, 9000);
    expect(brief(pieces).slice(0, 3)).toEqual([
      [0, 5000, 'stand', S, S, -1],
      [5000, 5300, 'start_up', -10, -10, -1],
      [5300, 6500, 'ramp', 0, 60, 0],
    ]);
    expect(unmet.map(({ cause, from_s, to_s }) => [cause, from_s, to_s])).toEqual([
      ['connection', 3600, 5000],
      ['connection', 5000, 5300],
    ]);
    const never = ceiling(Number.NEGATIVE_INFINITY, Number.POSITIVE_INFINITY, { charge_max_W: 0 });
    const none = commandOf(unit, [discharge(60, 3600, 9000)], [never], warm, 9000);
    expect(none.pieces.every((p) => p.purpose === 'stand')).toBe(true);
    expect(none.unmet).toHaveLength(1);
  });

  it('does not begin a run that could not get to its least power', () => {
    // 15 kW take 300 s: from 1000 s on until 1300 s at the soonest.
    const short = (to_s: number, ceilings: Ceiling[] = []) =>
      commandOf(unit, [discharge(60, 1000, to_s)], ceilings, warm, 9000);
    expect(short(1300).pieces.some((p) => p.mode === 'discharge')).toBe(true);
    const told = short(1299);
    expect(told.pieces.every((p) => p.purpose === 'stand')).toBe(true);
    const least = { cause: 'below_least_power', from_s: 1000, to_s: 1299, missing_W: 60e3 };
    expect(told.unmet).toEqual([{ leg: 0, ...least }]);
    // With an outage from 1600 s on it would have to come down again from 1300 s.
    const out = (from_s: number) => [
      ceiling(from_s, 9000, { discharge_max_W: 0, cause: 'outage' }),
    ];
    expect(short(5000, out(1600)).pieces.some((p) => p.mode === 'discharge')).toBe(true);
    expect(short(5000, out(1599)).pieces.some((p) => p.mode === 'discharge')).toBe(false);
  });

  it('takes the least of several ceilings and names it', () => {
    const both = [
      ceiling(0, 9000, { discharge_max_W: 50e3 }),
      ceiling(1000, 2000, { discharge_max_W: 40e3, cause: 'outage' }),
      ceiling(1500, 3000, { discharge_max_W: 45e3 }),
    ];
    const { pieces, unmet } = commandOf(plain, [discharge(60, 0, 4000)], both, running, 4000);
    expect(brief(pieces).map((row) => [row[0], row[3]])).toEqual([
      [0, 50],
      [1000, 40],
      [1500, 40],
      [2000, 45],
      [3000, 50],
    ]);
    expect(unmet.map(({ cause }) => cause)).toEqual([
      ...['connection', 'outage', 'outage', 'connection', 'connection'],
    ]);
  });

  it('without ramps and start-ups does everything at once', () => {
    const legs = [discharge(60, 0, HOUR), charge(100, HOUR, 2 * HOUR)];
    const { pieces, unmet } = commandOf(plain, legs, [], warm, 3 * HOUR);
    expect(brief(pieces)).toEqual([
      [0, HOUR, 'run', 60, 60, 0],
      [HOUR, 2 * HOUR, 'run', -100, -100, 1],
      [2 * HOUR, 3 * HOUR, 'stand', S, S, -1],
    ]);
    expect(unmet).toEqual([]);
  });

  it('cuts an open leg, and what is unmet of it, at the end', () => {
    const open = discharge(100, 0, Number.POSITIVE_INFINITY);
    const { pieces, unmet } = commandOf(unit, [open], [], running, 5000);
    expect(pieces.at(-1)!.to_s).toBe(5000);
    expect(unmet.map(({ to_s }) => to_s)).toEqual([5000]);
  });

  it('refuses legs that no plan can have', () => {
    const wrong = (legs: Leg[], words: RegExp) =>
      expect(() => commandOf(unit, legs, [], warm, HOUR)).toThrow(words);
    wrong([discharge(60, 100, 50)], /legs\[0\]\.to_s = 50/);
    wrong([discharge(60, 0, 200), discharge(60, 100, 300)], /legs\[1\]\.from_s = 100/);
    wrong([discharge(-1, 0, 200)], /power_W = -1000/);
    wrong([discharge(60, -1, 200)], /from_s = -1/);
    wrong([{ ...discharge(60, 0, Infinity) }, discharge(60, Infinity, Infinity)], /Infinity/);
  });
});

const END = 8 * HOUR;
/** Mostly none, so that legs of one direction run on. */
const quarters = fc.constantFrom(0, 0, 0, 1, 6);
const anyLegs = fc
  .array(
    fc.record({
      mode: fc.constantFrom<Leg['mode']>('charge', 'discharge', 'discharge', 'stand'),
      power_W: fc.integer({ min: 0, max: 220e3 }),
      gap: quarters,
      length: fc.integer({ min: 1, max: 90 }),
    }),
    { maxLength: 5 },
  )
  .map((blocks) => {
    let at = 0;
    return blocks.map(({ mode, power_W, gap, length }): Leg => {
      const from_s = at + gap * 450;
      at = from_s + length * 100;
      return { mode, power_W, from_s, to_s: at };
    });
  });
const anyCeilings = fc.array(
  fc
    .record({
      from: fc.integer({ min: -5, max: 300 }),
      length: fc.integer({ min: 1, max: 100 }),
      charge_max_W: fc.constantFrom(0, 9e3, 30e3, 120e3, 200e3),
      discharge_max_W: fc.constantFrom(0, 10e3, 30e3, 60e3, 90e3),
      cause: fc.constantFrom<Ceiling['cause']>('connection', 'outage'),
    })
    .map(({ from, length, ...most }): Ceiling => {
      return { ...most, from_s: from * 100, to_s: (from + length) * 100 };
    }),
  { maxLength: 3 },
);
const anyBefore = fc.constantFrom(warm, { ...warm, stood_s: 9e3 }, { ...warm, last: null });
/** By name: a failure prints its arguments, and units are long. */
const UNITS = {
  plain,
  ramps: unit,
  slow: unitOf({
    limits: {
      ...plain.limits,
      operation: { ...operation, ramp_W_s: { charge: null, discharge: 9 } },
    },
  }),
};
const anyUnit = fc.constantFrom<keyof typeof UNITS>('ramps', 'plain', 'slow');
const RUNS = { numRuns: 400, seed: 4 };
const near = (a: number, b: number, size: number) => Math.abs(a - b) <= 1e-9 * size;

describe('every command', () => {
  it('is whole: pieces follow each other from 0 to the end', () => {
    fc.assert(
      fc.property(anyUnit, anyLegs, anyCeilings, anyBefore, (name, legs, ceilings, before) => {
        const own = UNITS[name];
        const { pieces } = commandOf(own, legs, ceilings, before, END);
        let at = 0;
        for (const piece of pieces) {
          if (piece.from_s !== at || !(piece.to_s > at)) return false;
          at = piece.to_s;
        }
        return at === END;
      }),
      RUNS,
    );
  });

  it('never has power above a limit or a ceiling, in no direction', () => {
    fc.assert(
      fc.property(anyUnit, anyLegs, anyCeilings, anyBefore, (name, legs, ceilings, before) => {
        const own = UNITS[name];
        const { pieces } = commandOf(own, legs, ceilings, before, END);
        return pieces.every((piece) => {
          const { mode, from_s, to_s } = piece;
          if (mode === 'stand') return true;
          // Linear between a ceiling's edges and its own: greatest at the ends of each stretch.
          const edges = ceilings.flatMap((c) => [c.from_s, c.to_s]);
          const inside = edges.filter((t) => t > from_s && t < to_s).sort((a, b) => a - b);
          const cuts = [from_s, ...inside, to_s];
          return cuts.slice(1).every((end, k) => {
            const begin = cuts[k]!;
            const middle = (begin + end) / 2;
            const most = ceilings
              .filter((c) => c.from_s <= middle && c.to_s > middle)
              .map((c) => (mode === 'charge' ? c.charge_max_W : c.discharge_max_W));
            const limit = Math.min(own.limits[mode].power_max_W, ...most);
            return [begin, end].every((t) => {
              const share = (t - from_s) / (to_s - from_s);
              const power = piece.power0_W + (piece.power1_W - piece.power0_W) * share;
              return Math.abs(power) <= limit + 1e-6;
            });
          });
        });
      }),
      RUNS,
    );
  });

  it('never ramps faster than the machine, and turns only through a stand', () => {
    fc.assert(
      fc.property(anyUnit, anyLegs, anyCeilings, anyBefore, (name, legs, ceilings, before) => {
        const own = UNITS[name];
        const { pieces } = commandOf(own, legs, ceilings, before, END);
        return pieces.every((piece, i) => {
          const { mode, from_s, to_s, power0_W, power1_W } = piece;
          const last = pieces[i - 1];
          const rate = mode === 'stand' ? null : own.limits.operation?.ramp_W_s[mode];
          if (mode === 'stand' || rate === null || rate === undefined) return true;
          // From nothing after a stand, else from where the piece before ended.
          const joins = last === undefined || last.mode === 'stand' ? 0 : last.power1_W;
          if (last !== undefined && last.mode !== 'stand' && last.mode !== mode) return false;
          const fits = Math.abs(power1_W - power0_W) <= rate * (to_s - from_s) + 1e-6;
          return fits && near(power0_W, joins, 1e5);
        });
      }),
      RUNS,
    );
  });

  it('draws the energy of each start-up in full, ahead of every run after a stand', () => {
    fc.assert(
      fc.property(anyLegs, anyCeilings, anyBefore, (legs, ceilings, before) => {
        const { pieces } = commandOf(unit, legs, ceilings, before, END);
        return pieces.every((piece, i) => {
          const last = pieces[i - 1];
          if (piece.mode === 'stand' || (last !== undefined && last.mode !== 'stand')) return true;
          if (last?.purpose !== 'start_up') return false;
          const drawn = -energyBetween([last], 0, END);
          const { warm: w, cold: c } = unit.limits.operation!.start;
          return near(drawn, w.energy_J, 3e6) || near(drawn, c.energy_J, 3e6);
        });
      }),
      RUNS,
    );
  });

  it('gives the integral of net power over the blocks of any grid', () => {
    fc.assert(
      fc.property(anyLegs, anyCeilings, fc.integer({ min: 1, max: 97 }), (legs, ceilings, n) => {
        const { pieces } = commandOf(unit, legs, ceilings, warm, END);
        const whole = pieces.reduce(
          (sum, p) => sum + ((p.power0_W + p.power1_W) / 2) * (p.to_s - p.from_s),
          0,
        );
        const blocks = Array.from({ length: n }, (_, i) =>
          energyBetween(pieces, (i * END) / n, ((i + 1) * END) / n),
        );
        return near(
          blocks.reduce((sum, e) => sum + e, 0),
          whole,
          1e9,
        );
      }),
      RUNS,
    );
  });

  it('meets each leg but for its ramps and what it says is unmet', () => {
    fc.assert(
      fc.property(anyLegs, anyCeilings, anyBefore, (legs, ceilings, before) => {
        const { pieces, unmet } = commandOf(unit, legs, ceilings, before, 3 * END);
        return legs.every((leg, index) => {
          if (leg.mode === 'stand') return unmet.every((part) => part.leg !== index);
          const sign = leg.mode === 'discharge' ? 1 : -1;
          const asked = leg.power_W * (leg.to_s - leg.from_s);
          const lacks = unmet
            .filter((part) => part.leg === index)
            .reduce((sum, part) => sum + part.missing_W * (part.to_s - part.from_s), 0);
          const own = pieces.filter((p) => p.leg === index && p.mode !== 'stand');
          const within = sign * energyBetween(own, leg.from_s, leg.to_s);
          // A ramp of the leg itself lacks, or has from the leg before, at most p^2/(2 rate).
          const rate = operation.ramp_W_s[leg.mode]!;
          const most = own.length === 0 ? 0 : unit.limits[leg.mode].power_max_W ** 2 / (2 * rate);
          const runs = own.filter((p) => p.from_s < leg.to_s && p.purpose === 'ramp').length;
          return Math.abs(asked - lacks - within) <= most * runs + 1e-3;
        });
      }),
      RUNS,
    );
  });

  it('split at an edge through which the unit runs is the same command', () => {
    let ran = 0;
    fc.assert(
      fc.property(anyUnit, anyLegs, anyCeilings, anyBefore, (name, legs, ceilings, before) => {
        const own = UNITS[name];
        const whole = commandOf(own, legs, ceilings, before, END).pieces;
        return legs.slice(1).every((leg, k) => {
          const at_s = leg.from_s;
          const last = whole.find((p) => p.to_s === at_s && p.mode !== 'stand');
          const next = whole.find((p) => p.from_s === at_s);
          // A leg that ends there is ramped down from in the whole, which a plan cut there is not told.
          if (last === undefined || next?.leg !== k + 1 || next.mode !== last.mode) return true;
          ran++;
          const running = { mode: last.mode, power_W: last.power1_W, stood_s: 0, last: null };
          const later = <T extends { from_s: number; to_s: number }>(one: T): T => ({
            ...one,
            from_s: Math.max(one.from_s - at_s, 'cause' in one ? Number.NEGATIVE_INFINITY : 0),
            to_s: one.to_s - at_s,
          });
          const rest = commandOf(
            ...([own, legs.slice(k + 1).map(later), ceilings.map(later)] as const),
            ...([running, END - at_s] as const),
          ).pieces;
          const expected = whole.filter((p) => p.from_s >= at_s);
          return (
            rest.length === expected.length &&
            rest.every((piece, i) => {
              const same = expected[i]!;
              return (
                piece.mode === same.mode &&
                near(piece.from_s + at_s, same.from_s, 1e3) &&
                near(piece.power0_W, same.power0_W, 1e5) &&
                near(piece.power1_W, same.power1_W, 1e5)
              );
            })
          );
        });
      }),
      RUNS,
    );
    expect(ran).toBeGreaterThan(20);
  });
});
