import { beforeAll, describe, expect, it } from 'vitest';
import { createBedWork } from '../../../src/core/bed/kernel.js';
import { enthalpyAt, temperatureAt } from '../../../src/core/bed/tables.js';
import type { RolloutStore } from '../../../src/core/dispatch/rollout.js';
import { type PlanContext, planContext } from '../../../src/core/plan/context.js';
import { marchCourse } from '../../../src/core/plan/course.js';
import { type Evaluation, holding } from '../../../src/core/plan/evaluation.js';
import type { Leg } from '../../../src/core/plan/leg.js';
import { createPlanner } from '../../../src/core/plan/planner.js';
import { type Schedule, scheduleOf } from '../../../src/core/plan/schedule.js';
import { chargeRecord } from '../../../src/core/plan/storeCharge.js';
import type { TubeState } from '../../../src/core/track/tube.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { mulberry } from '../../support/random.js';
import { watchedUnit } from '../dispatch/fullUnit.js';
import { factorOf } from '../dispatch/sampledPlants.js';
import { unitOf } from '../track/plants.js';

/**
 * A discharge that nearly empties the stores and a charge that nearly fills them, against members:
 * plants drawn from the estimate's own covariance, each marched by itself through both runs, without
 * any gradient. Members stop where their own rules break, so that a second run begins with what the
 * first one left.
 */
const MEMBERS = 300;
const unit = unitOf();
const H = 3600;
/** An edge that all members come to. */
const MIDDLE_S = 2 * H;
const LEGS: Leg[] = [
  { mode: 'discharge', power_W: 60e3, from_s: 0, to_s: MIDDLE_S },
  { mode: 'discharge', power_W: 60e3, from_s: MIDDLE_S, to_s: 3.05 * H },
  { mode: 'charge', power_W: 120e3, from_s: 4 * H, to_s: 9 * H },
];

let schedule: Schedule;
/** As the schedule is evaluated, but that its most likely course is marched as a member is. */
let alike: Evaluation;
/** Of each member: whether each run held to its end, and the states of charge at the middle. */
let held: boolean[][];
let charges: number[][];

beforeAll(() => {
  const model = unitModel(unit);
  const state = watchedUnit(unit, { hot: 0.6, cold: 0.6 }, 3);
  const context: PlanContext = planContext(model, state);
  const blocks = LEGS.map(({ mode, power_W, from_s, to_s }) => ({
    ...{ mode, power_W },
    from_ms: context.now_ms + from_s * 1000,
    to_ms: context.now_ms + to_s * 1000,
  }));
  schedule = scheduleOf(context, { blocks, certainty: 0.9, zone: null });

  const planner = createPlanner(context, LEGS, 9 * H);
  const { outlook } = planner;
  const command = planner.command(LEGS);
  const { beyond_s } = planner;
  alike = planner.evaluate(command, {
    best: () => outlook.march(command, {}, { beyond_s }),
    march: (change) => outlook.march(command, change, { beyond_s }),
    marchFine: (change) => outlook.marchFine(command, change, { beyond_s }),
  });
  const { ahead, options } = outlook.bare();
  const { mean, covariance } = outlook.calibration;
  const n = mean.length;
  const joint = factorOf(Float64Array.from(covariance.flatMap((row) => [...row])), n);
  const random = mulberry(7);
  const normal = (): number =>
    Math.sqrt(-2 * Math.log(1 - random())) * Math.cos(2 * Math.PI * random());
  const drawnBy = (l: Float64Array, size: number): Float64Array => {
    const z = Float64Array.from({ length: size }, normal);
    return z.map((_, i) => {
      let sum = 0;
      for (let j = 0; j <= i; j++) sum += (l[i * size + j] as number) * (z[j] as number);
      return sum;
    });
  };
  const factors = model.stores.map((store, s) =>
    store.tubes.map((tube, k) => {
      const own = state.stores[s]!.tubes[k] as TubeState;
      return factorOf(own.covariance, tube.layout.size);
    }),
  );
  const works = model.stores.map((m) => m.tubes.map((t) => createBedWork(t.layout.cells)));
  held = [];
  charges = [];
  for (let m = 0; m < MEMBERS; m++) {
    const logs = drawnBy(joint, n);
    const stores = ahead.stores.map((store, s): RolloutStore => {
      const { tables, tubes: models } = model.stores[s]!;
      const tubes = store.tubes.map((tube, k) => {
        const { cells, size, transfer } = models[k]!.layout;
        const error = drawnBy(factors[s]![k]!, size);
        return {
          ...tube,
          enthalpy: tube.enthalpy.map((h, i) =>
            enthalpyAt(tables, temperatureAt(tables, h) + (i < cells ? error[i]! : 0)),
          ),
          // At rest the filter ties nothing to the flow, which is what the calibration says.
          flowFactor: tube.flowFactor * Math.exp(logs[s]!),
          heatTransferFactor: tube.heatTransferFactor * Math.exp(error[transfer]!),
        };
      });
      return { ...store, tubes };
    });
    const changed = {
      ...{ ...ahead, stores },
      workFactor: {
        discharge: ahead.workFactor.discharge * Math.exp(logs[n - 2]!),
        charge: ahead.workFactor.charge * Math.exp(logs[n - 1]!),
      },
      ambient_K: ahead.ambient_K + 3 * normal(),
    };
    const record = chargeRecord(model.stores, stores, [MIDDLE_S]);
    const course = marchCourse(changed, command, {
      ...options,
      ...{ works, beyond_s: 1200, each: record.each },
    });
    // Found at the step after it: a break within the last step of a run is seen past its end.
    held.push(course.episodes.map((one) => one.first_s >= one.held_s));
    charges.push(record.charges[0]!);
  }
});

/** Three standard errors of a share among the members, and that of 2048 points. */
const within = (p: number): number => 3 * Math.sqrt((p * (1 - p)) / MEMBERS) + 1 / 2048;
const share = (of: (runs: boolean[]) => boolean): number =>
  held.filter((runs) => of(runs)).length / MEMBERS;

describe('the probability that a schedule holds', () => {
  it('of each run and of both jointly is the share of members that hold', () => {
    const { course, first_s } = alike;
    const of = (e: number): number => holding([course.episodes[e]!], [first_s[e]!]);
    for (const [p, found] of [
      [of(0), share(([a]) => a!)],
      [of(1), share(([, b]) => b!)],
      [holding(course.episodes, first_s), share(([a, b]) => a! && b!)],
    ] as const) {
      // Neither sure to hold nor to fail, or nothing would be tested.
      expect(p).toBeGreaterThan(0.3);
      expect(p).toBeLessThan(0.95);
      expect(Math.abs(p - found)).toBeLessThan(within(p));
    }
  });
});

describe('the state of charge along a schedule', () => {
  it('has the mean and the sigma of the members', () => {
    const middle = schedule.charge[1]!;
    unit.stores.forEach(({ id }, s) => {
      const values = charges.map((socs) => socs[s]!);
      const mean = values.reduce((a, b) => a + b, 0) / MEMBERS;
      const sigma = Math.sqrt(values.reduce((a, b) => a + (b - mean) ** 2, 0) / (MEMBERS - 1));
      const { soc, soc_sigma } = middle.stores[id]!;
      // Three standard errors of a mean and of a standard deviation; a mean of bare cells is 0.002 off.
      expect(Math.abs(soc - mean)).toBeLessThan((3 * sigma) / Math.sqrt(MEMBERS) + 0.002);
      expect(Math.abs(soc_sigma / sigma - 1)).toBeLessThan(3 / Math.sqrt(2 * MEMBERS));
    });
  });
});
