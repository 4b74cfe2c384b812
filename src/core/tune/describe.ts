import type { Direction, UnitDefinition } from '../definitions.js';
import type { UnitModel } from '../unitModel.js';
import { type Combined, placeOfStore, STORE, UNIT } from './combine.js';
import { configureOf } from './configure.js';
import type { Evidence } from './evidence.js';
import type { StoreFit } from './fitTypes.js';
import type { MachineWork } from './machineWork.js';
import type { TunePriors } from './priors.js';
import type { TuneRecord } from './record.js';
import type { Tunable, TuneReason, TuneResult, TuneRow } from './result.js';

/** A posterior sigma above the prior's over root 2 means that the recording tells less than was known. */
const LEAST_GAIN = Math.SQRT1_2;
/** Beyond this correlation two values are one. */
const MOST_CORRELATION = 0.95;
/** Less standing shows neither conduction nor losses against flow [h]. */
const STANDING_H = 4;
/** A front that moves by less than this has not passed a string [m]. */
const LEAST_WAY_M = 0.5;

/** One row before it is judged: a linear form of the combined values. */
interface Form {
  readonly store: string | null;
  readonly name: Tunable;
  readonly terms: readonly (readonly [place: number, factor: number])[];
  readonly prior: number | null;
  /** Reason that the kind of recording gives, whatever the figures. */
  readonly given: TuneReason | null;
}

function formsOf(
  unit: UnitDefinition,
  work: Readonly<Record<Direction, MachineWork | null>>,
  priors: TunePriors,
  evidence: readonly Evidence[],
): Form[] {
  const powered = work.charge !== null || work.discharge !== null;
  const apart: TuneReason | null = powered ? null : 'meter_or_heat_capacity';
  const own = (name: Tunable, direction: Direction): Form => ({
    store: null,
    name,
    terms: [
      [UNIT.meter, 1],
      [UNIT[direction], 1],
    ],
    prior: Math.hypot(priors.machine, priors.meter),
    given: work[direction] === null ? 'no_power_that_way' : null,
  });
  const forms: Form[] = [
    {
      store: null,
      name: 'true_over_metered_flow',
      terms: [[UNIT.meter, 1]],
      prior: priors.meter,
      given: apart,
    },
    own('work_charge', 'charge'),
    own('work_discharge', 'discharge'),
  ];
  unit.stores.forEach((store, s) => {
    const at = placeOfStore(s);
    const seen = evidence[s] as Evidence;
    const still: TuneReason | null = seen.way_m < LEAST_WAY_M ? 'front_too_still' : null;
    const one = (name: Tunable, place: number, prior: number, given: TuneReason | null): Form => ({
      store: store.id,
      name,
      terms: [[at + place, 1]],
      prior,
      given,
    });
    const conduction =
      seen.standing_h < STANDING_H
        ? 'no_standing'
        : seen.steep_h < STANDING_H
          ? 'no_steep_front_standing'
          : null;
    const losses =
      seen.toWall_m > seen.reach_m
        ? 'no_string_near_wall'
        : seen.standing_h < STANDING_H
          ? 'no_standing'
          : null;
    forms.push(
      one('heat_transfer', STORE.transfer, priors.transfer, still),
      one('conductivity', STORE.conductivity, priors.conductivity, conduction),
      one('loss', STORE.loss, priors.loss, losses),
      one('heat_capacity', STORE.capacity, priors.capacity, still ?? apart),
      one('gas_share', STORE.share, priors.share, still),
      {
        store: store.id,
        name: 'front_travel',
        terms: [
          [UNIT.meter, 1],
          [at + STORE.capacity, -1],
        ],
        prior: Math.hypot(priors.meter, priors.capacity),
        given: still,
      },
    );
  });
  return forms;
}

/**
 * Turns what was combined into rows, each judged, and into factors for the configuration.
 *
 * @param combined ln of everything, and its covariance; see `combine`
 * @param evidence what the recording holds, by store
 */
export function describe(
  model: UnitModel,
  record: TuneRecord,
  fits: readonly StoreFit[],
  work: Readonly<Record<Direction, MachineWork | null>>,
  combined: Combined,
  priors: TunePriors,
  evidence: readonly Evidence[],
): TuneResult {
  const { unit } = model;
  const forms = formsOf(unit, work, priors, evidence);
  const covariance = forms.map((a) =>
    forms.map((b) => {
      let sum = 0;
      for (const [p, f] of a.terms) {
        for (const [q, g] of b.terms) {
          sum += f * g * (combined.covariance[p * combined.size + q] as number);
        }
      }
      return sum;
    }),
  );
  const sigma = covariance.map((row, i) => Math.sqrt(Math.max(0, row[i] as number)));
  const correlations = covariance.map((row, i) =>
    row.map((c, j) =>
      i === j ? 1 : c / Math.max(1e-300, (sigma[i] as number) * (sigma[j] as number)),
    ),
  );
  const logs = forms.map((form) =>
    form.terms.reduce((sum, [p, f]) => sum + f * (combined.values[p] as number), 0),
  );
  const rows = forms.map((form, i): TuneRow => {
    const base = {
      store: form.store,
      name: form.name,
      value: configured(unit, form) * Math.exp(logs[i] as number),
    };
    const value = form.name === 'gas_share' ? (logs[i] as number) : base.value;
    const with_ = closest(correlations[i] as number[], i, forms);
    const reason = judge(form, sigma[i] as number, with_?.correlation ?? 0);
    return {
      ...base,
      value,
      sigma: sigma[i] as number,
      prior_sigma: form.prior,
      determined: reason === null,
      reason,
      with: with_,
    };
  });
  const settled = fits.map((fit) => fit.converged);
  const hours = (sign: number) =>
    record.bins.reduce((sum, b) => sum + (Math.sign(b.flow_kg_s) === sign ? b.dt_s : 0), 0) / 3600;
  return {
    unit: unit.id,
    from: new Date(record.from_ms).toISOString(),
    to: new Date(record.to_ms).toISOString(),
    hours: { charge: hours(1), discharge: hours(-1), stand: hours(0) },
    other_stretches: Math.max(0, record.stretches - 1),
    other_hours: record.leftOut_s / 3600,
    rows,
    correlations,
    fits: fits.map((fit, s) => ({
      store: unit.stores[s]?.id ?? '',
      residual_K: fit.residual_K,
      converged: fit.converged,
      left_out: fit.leftOut,
    })),
    configure: configureOf(unit, rows, settled),
  };
}

/** What the configuration says of a row already: factors are told as a whole. */
function configured(unit: UnitDefinition, form: Form): number {
  const store = unit.stores.find((one) => one.id === form.store);
  switch (form.name) {
    case 'heat_transfer':
      return store?.bed.heat_transfer_factor ?? 1;
    case 'conductivity':
      return store?.bed.conductivity_factor ?? 1;
    case 'loss':
      return store?.bed.loss_factor ?? 1;
    case 'heat_capacity':
      return store?.bed.heat_capacity_factor ?? 1;
    case 'work_charge':
      return unit.machine.work_factor?.charge ?? 1;
    case 'work_discharge':
      return unit.machine.work_factor?.discharge ?? 1;
    default:
      return 1;
  }
}

/** The other row that a row moves with most; a sum is no other than its own terms. */
function closest(
  correlations: readonly number[],
  i: number,
  forms: readonly Form[],
): { row: number; correlation: number } | null {
  let best: { row: number; correlation: number } | null = null;
  correlations.forEach((correlation, row) => {
    if (row === i || forms[row]?.given !== null) return;
    if (forms[row]?.terms.length !== 1 || forms[i]?.terms.length !== 1) return;
    if (best === null || Math.abs(correlation) > Math.abs(best.correlation)) {
      best = { row, correlation };
    }
  });
  return best;
}

function judge(form: Form, sigma: number, correlation: number): TuneReason | null {
  if (form.given !== null) return form.given;
  if (form.prior !== null && sigma > LEAST_GAIN * form.prior) {
    return form.name === 'heat_capacity' || form.name === 'true_over_metered_flow'
      ? 'meter_or_heat_capacity'
      : 'tells_less_than_known';
  }
  return Math.abs(correlation) > MOST_CORRELATION ? 'moves_with_another' : null;
}
