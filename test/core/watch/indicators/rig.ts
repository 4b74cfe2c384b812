import { loadSite } from '../../../../src/config/load.js';
import type { Mode, UnitDefinition } from '../../../../src/core/definitions.js';
import { setTubeTemperatures, type TubeState } from '../../../../src/core/track/tube.js';
import { resetWall } from '../../../../src/core/track/wallZone.js';
import { startUnit } from '../../../../src/core/unit.js';
import { unitModel } from '../../../../src/core/unitModel.js';
import type { UnitState } from '../../../../src/core/unitState.js';
import type { Taken } from '../../../../src/core/unitTakeIn.js';
import type {
  Indicator,
  IndicatorInput,
  IndicatorView,
} from '../../../../src/core/watch/indicator.js';
import { INDICATORS_DEFAULT } from '../../../../src/core/watch/rules.js';

export const demo = loadSite('config/demo.yaml').units[0] as UnitDefinition;

/** What the unit does and reads in one scan; channels that are not named are missing. */
export interface Moment {
  readonly mode: Mode;
  readonly flow_kg_s?: number;
  readonly values?: Readonly<Record<string, number>>;
  /** State of charge of the stores, hot and cold. */
  readonly soc?: readonly [number, number];
  /** One sigma of each. */
  readonly soc_sigma?: number;
}

/** An indicator over made-up scans of a unit, whose beds stand as they are set. */
export class Rig<S> {
  readonly model;
  readonly state: UnitState;
  readonly own: S;
  time_ms = Date.UTC(2026, 0, 1);
  watching = INDICATORS_DEFAULT;
  private readonly index;

  constructor(
    private readonly indicator: Indicator<S>,
    readonly unit: UnitDefinition = demo,
    private readonly scan_s = 60,
  ) {
    this.model = unitModel(unit);
    this.state = startUnit(unit);
    this.own = indicator.start(this.model);
    this.index = new Map(unit.channels.map(({ id }, i) => [id, i]));
    for (const store of this.state.stores) store.started = true;
  }

  /** Sets all tubes of a store to T(x) [K], wall zone included. */
  fill(s: number, profile: (x_m: number) => number): void {
    const model = this.model.stores[s]!;
    const state = this.state.stores[s]!;
    const { length_m } = model.store.bed;
    model.tubes.forEach((tube, k) => {
      const { cells } = tube.layout;
      const x = Float64Array.from({ length: cells }, (_, i) => ((i + 0.5) * length_m) / cells);
      setTubeTemperatures(tube, state.tubes[k]!, x.map(profile));
    });
    if (model.wall !== null && state.wall !== null)
      resetWall(model.tables, state.wall, state.tubes[model.wall.tube] as TubeState);
  }

  /** One scan. */
  step(moment: Moment): IndicatorView[] {
    const { mode, flow_kg_s = 0, soc = [0.5, 0.5], soc_sigma = 0.004 } = moment;
    this.time_ms += 1000 * this.scan_s;
    this.state.mode = mode;
    const values = new Float64Array(this.unit.channels.length).fill(Number.NaN);
    for (const [id, value] of Object.entries(moment.values ?? {})) {
      const at = this.index.get(id);
      if (at === undefined) throw new RangeError(`channel ${id}: not of this unit`);
      values[at] = value;
    }
    const conditions = {
      ...{ mode, flow_kg_s, flowKnown: true, flowStandIn: false },
      ...{ power_W: Number.NaN, ambient_K: 288 },
    };
    const stores = soc.map((one) => ({
      step: 'updated',
      energy: { soc: one, soc_sigma },
    }));
    const taken = { conditions, dt_s: this.scan_s, stores, scan: { values } };
    const input = {
      ...{ unit: this.unit, model: this.model, state: this.state, spread: {}, estimate: null },
      ...{ taken: taken as unknown as Taken, time_ms: this.time_ms, dt_s: this.scan_s },
    } as unknown as IndicatorInput;
    const rule = this.watching.rules[this.indicator.kind];
    return this.indicator.step(this.own, rule, this.watching, input);
  }

  /** Scans for so many hours; `moment` of the time since their start [h]. */
  run(hours: number, moment: (t_h: number) => Moment): IndicatorView[] {
    const scans = Math.round((hours * 3600) / this.scan_s);
    let views: IndicatorView[] = [];
    for (let n = 1; n <= scans; n++) views = this.step(moment((n * this.scan_s) / 3600));
    return views;
  }
}
