import type { Direction, Mode } from '../../../../src/core/definitions.js';
import type { HeatBalance } from '../../../../src/core/dispatch/heatBalance.js';
import type { StoreEstimate } from '../../../../src/core/estimate.js';
import { storeModel } from '../../../../src/core/track/storeTracker.js';
import type {
  Indicator,
  IndicatorInput,
  IndicatorRule,
  IndicatorsDefinition,
  IndicatorView,
} from '../../../../src/core/watch/indicator.js';
import { INDICATORS_DEFAULT } from '../../../../src/core/watch/rules.js';
import type { SpreadRatio } from '../../../../src/core/watch/spreadRatio.js';
import { coldStore, ESTIMATOR, hotBed, hotStore, stringOf, unitOf } from '../../track/plants.js';
import { normals } from '../normals.js';
import { estimateOf } from '../units.js';

export const START_MS = Date.UTC(2026, 0, 1);
const FRONT = { position_m: 1, position_sigma_m: 0.01, width_m: 0.3, width_sigma_m: 0.01 };

/** What the plant does in one scan of a script; by store and string where that differs. */
export interface Moment {
  readonly mode?: Mode;
  /** ln phi_h of a store; ln of a string's flow over the metered; 0 where not named. */
  readonly transfer?: Readonly<Record<string, number>>;
  readonly flow?: Readonly<Record<string, number>>;
  /** Offset of the gas thermometer at the charge inlet, as the tubes have it [K]. */
  readonly inlet_K?: Readonly<Record<string, number>>;
  readonly front?: boolean;
  readonly flowKnown?: boolean;
  readonly step?: 'updated' | 'reacquired' | 'missed';
  readonly spread?: Readonly<Record<string, SpreadRatio | null>>;
  readonly travelled_m?: number;
  /** Starts of the twin anew, and whether the front that it started with is still in it. */
  readonly restarts?: number;
  readonly startLeft?: boolean;
  readonly estimate?: Readonly<Record<string, Partial<StoreEstimate>>>;
  readonly balances?: Readonly<Record<string, HeatBalance>>;
}

/** Two stores of three strings, or of one. */
export function storesOf(strings: readonly string[] = ['a', 'b', 'c']) {
  const of = (id: string) =>
    strings.map((name) =>
      stringOf(`${id}_${name}`, 5, hotBed().length_m, {
        id: name,
        area_share: 1 / strings.length,
      }),
    );
  const stores = [hotStore({ strings: of('hot') }), coldStore({ strings: of('cold') })];
  const unit = unitOf({ stores });
  const models = stores.map((store) =>
    storeModel(
      store,
      unit.estimator,
      store.strings.map((s) => s.thermocouples.map(() => 0)),
      store.strings.map((s) => s.thermocouples.map(() => 0)),
    ),
  );
  return { unit, models };
}

/** A scalar filter of a slow figure, as honest as can be: it measures the truth and walks. */
class Scalar {
  value = 0;
  variance: number;

  constructor(
    sigma: number,
    private readonly walkPerRootHour: number,
    private readonly noise: number,
    private readonly draw: () => number,
  ) {
    this.variance = sigma ** 2;
  }

  step(truth: number, dt_s: number, flowing: boolean, seen: boolean): void {
    if (flowing) this.variance += this.walkPerRootHour ** 2 * (dt_s / 3600);
    if (!seen) return;
    // White in time: a scan's noise for the time it stands for.
    const noise = this.noise ** 2 * (3600 / dt_s);
    const gain = this.variance / (this.variance + noise);
    this.value += gain * (truth + Math.sqrt(noise) * this.draw() - this.value);
    this.variance *= 1 - gain;
  }
}

export interface RunOptions {
  readonly strings?: readonly string[];
  readonly seed?: number;
  readonly dt_s?: number;
  readonly watching?: Partial<IndicatorsDefinition>;
  readonly rule?: Partial<IndicatorRule>;
  /** Sigma of what the filter learns of transfer and flow in an hour. */
  readonly transferNoise?: number;
  readonly flowNoise?: number;
  readonly state?: unknown;
  readonly each?: (hour: number, views: readonly IndicatorView[]) => void;
}

/** Runs an indicator over a script; the views of its last scan, and when each subject was first degraded [h]. */
export function watchScript<S>(
  indicator: Indicator<S>,
  hours: number,
  script: (hour: number) => Moment,
  options: RunOptions = {},
) {
  const { seed = 1, dt_s = 300, strings } = options;
  const { unit, models } = storesOf(strings);
  const draw = normals(seed);
  const tubes = models.map(({ tubes: own }) =>
    own.map(({ layout }) => ({
      further: new Float64Array(layout.size - layout.cells),
      covariance: new Float64Array(layout.size ** 2),
      transfer: new Scalar(
        ESTIMATOR.heat_transfer_factor_sigma,
        0.06,
        options.transferNoise ?? 0.12,
        draw,
      ),
      flow: new Scalar(ESTIMATOR.flow_factor_sigma, 0.01, options.flowNoise ?? 0.015, draw),
    })),
  );
  const watching = { ...INDICATORS_DEFAULT, ...options.watching };
  const rule = { ...watching.rules[indicator.kind], ...options.rule };
  const model = { unit, stores: models } as unknown as IndicatorInput['model'];
  const state = (options.state ?? indicator.start(model)) as S;
  const found: Record<string, number> = {};
  let views: IndicatorView[] = [];
  for (let n = 0; n * dt_s < hours * 3600; n++) {
    const hour = (n * dt_s) / 3600;
    const moment = script(hour);
    const mode = moment.mode ?? 'charge';
    const flowing = mode !== 'stand';
    const front = moment.front ?? true;
    const stores = models.map((store, s) => ({
      started: true,
      tubes: store.tubes.map(({ layout, string }, k) => {
        const own = tubes[s]![k]!;
        const id = store.store.id;
        own.transfer.step(moment.transfer?.[id] ?? 0, dt_s, flowing, flowing && front);
        own.flow.step(moment.flow?.[`${id}/${string.id}`] ?? 0, dt_s, flowing, flowing && front);
        const { further, covariance } = own;
        further[layout.flow - layout.cells] = own.flow.value;
        further[layout.transfer - layout.cells] = own.transfer.value;
        further[layout.inlet.charge_inlet - layout.cells] = moment.inlet_K?.[id] ?? 0;
        covariance[layout.flow * (layout.size + 1)] = own.flow.variance;
        covariance[layout.transfer * (layout.size + 1)] = own.transfer.variance;
        return { further, covariance, surprise: 1 };
      }),
    }));
    const fronts = front ? [FRONT] : [];
    const time_ms = START_MS + n * dt_s * 1000;
    const { hot = {}, cold = {} } = moment.estimate ?? {};
    const input = {
      unit,
      model,
      state: {
        stores,
        balances: models.map(({ store }) => moment.balances?.[store.id]),
        views: models.map(() => ({
          twin: {
            travelled_m: moment.travelled_m ?? 0,
            restarts: moment.restarts ?? 0,
            startWidth_m2: moment.startLeft ? 0 : 0.1,
          },
        })),
      },
      taken: {
        conditions: {
          mode,
          flow_kg_s: { charge: 1, discharge: -1, stand: 0 }[mode],
          flowKnown: moment.flowKnown ?? true,
          flowStandIn: false,
        },
        stores: models.map(() => ({ step: moment.step ?? 'updated' })),
        dt_s: n === 0 ? 0 : dt_s,
      },
      estimate: estimateOf(time_ms, { fronts, ...hot }, { fronts, ...cold }),
      spread: moment.spread ?? {},
      time_ms,
      dt_s: n === 0 ? 0 : dt_s,
    } as unknown as IndicatorInput;
    views = indicator.step(state, rule, watching, input);
    for (const { subject, state: decided } of views)
      if (decided === 'degraded') found[subject] ??= hour;
    options.each?.(hour, views);
  }
  return {
    found,
    views,
    state,
    of: (subject: string) => views.find((v) => v.subject === subject)!,
  };
}

/** A balance within a run, told in this scan, or with a last run told `age_s` ago. */
export function balanceOf(
  direction: Direction | null,
  last: Partial<HeatBalance['last']>,
): HeatBalance {
  return {
    ...{ direction, soc: 0.2, soc_sigma: 0.01, lasting: 0, passing: 0, share: 0, share_soc: 0 },
    ...{ steel: 0, metered: 0, lost: 0 },
    last: { charge: null, discharge: null, ...last },
  };
}

/** What holds for every view: finite or null, a score within bounds, a whole sentence, a reason where undecided. */
export function unsound(view: IndicatorView): string[] {
  const faults: string[] = [];
  for (const key of ['value', 'sigma', 'healthy', 'limit', 'deadband', 'score'] as const) {
    const number = view[key];
    if (number !== null && !Number.isFinite(number)) faults.push(`${key} ${number}`);
  }
  if (view.score !== null && (view.score < 0 || view.score > 1)) faults.push(`score ${view.score}`);
  if ((view.reason === null) !== (view.state !== 'undetermined'))
    faults.push(`reason ${view.reason}`);
  if (!/\.$/.test(view.sentence) || /NaN|undefined|null|Infinity/.test(view.sentence))
    faults.push(view.sentence);
  return faults.map((fault) => `${view.kind} ${view.subject}: ${fault}`);
}
