import type { UnitDefinition } from './definitions.js';
import { centralHours, computeHours } from './dispatch/hours.js';
import { hoursInput, hoursOf, stateOfCharge } from './dispatch/unitHours.js';
import type { Estimate, ProfileView, Quality, StoreEstimate } from './estimate.js';
import { countThermocouples, type ScanCounts } from './scanCounts.js';
import { type GasDoubt, gasDoubts } from './track/gasDoubts.js';
import { implausibleReadings, touchesEstimate } from './track/plausible.js';
import { estimateStore, profileOf, tubeFronts } from './track/storeEstimate.js';
import type { StoreState } from './track/storeTracker.js';
import { describeViews, type StoreViews, storeSpread } from './track/storeViews.js';
import type { TubeState } from './track/tube.js';
import type { UnitAsk, UnitStep } from './unit.js';
import type { UnitModel } from './unitModel.js';
import type { UnitState } from './unitState.js';
import type { Taken, TakenStore } from './unitTakeIn.js';
import { causesOf } from './watch/causes.js';
import { cycleScanOf } from './watch/cycle/unitScan.js';
import { cycleRules, startCycleLog, stepCycleLog } from './watch/cycleLog.js';
import { stepIndicators } from './watch/indicators.js';
import { isOutletNear, OUTLET_ALARM } from './watch/outletAlarm.js';
import { stepRunEnd } from './watch/runEnd.js';
import type { SpreadRatio } from './watch/spreadRatio.js';
import { stepWatch } from './watch/watch.js';

/** The estimate of a scan just taken in, the hours asked for, and what the watch raises. */
export function describe(model: UnitModel, state: UnitState, taken: Taken, ask: UnitAsk): UnitStep {
  const { unit } = model;
  const { scan } = taken;
  const flowing = taken.conditions.flow_kg_s !== 0;
  const stores: Record<string, StoreEstimate> = {};
  const spread: Record<string, SpreadRatio | null> = {};
  model.stores.forEach((store, s) => {
    const { energy, fronts, views } = taken.stores[s] as TakenStore;
    const storeState = state.stores[s] as StoreState;
    const ratio = storeSpread(store, storeState, state.views[s] as StoreViews, fronts.fronts);
    spread[store.store.id] = ratio;
    const own = store.tubes.map((tube, k) =>
      tubeFronts(store, tube, storeState.tubes[k] as TubeState),
    );
    stores[store.store.id] = estimateStore(store, storeState, {
      front_views: describeViews(store, own, views),
      spread_ratio: ratio?.ratio ?? null,
      flowing,
      fronts,
      tubeFronts: own,
      energy,
    });
  });
  const gas = gasDoubts(model, state.gas);
  const time = new Date(scan.time_ms).toISOString();
  const estimate: Estimate = {
    time,
    unit: unit.id,
    revision: 0,
    mode: taken.conditions.mode,
    quality: qualityOf(model, state, taken, gas),
    state_of_charge: stateOfCharge(
      model,
      state,
      scan,
      Math.min(...taken.stores.map((store) => store.energy.soc)),
      taken.conditions,
      taken.modeChanged,
      taken.before_ms,
      ask.turn,
    ),
    stores,
  };
  if (ask.hours_at_W.length > 0) {
    estimate.dispatch = hoursOf(model, state, ask.hours_at_W);
  }
  const profile: ProfileView | null = ask.profile
    ? {
        time,
        unit: unit.id,
        stores: Object.fromEntries(
          model.stores.map((store, s) => [
            store.store.id,
            profileOf(store, state.stores[s] as StoreState, scan.values),
          ]),
        ),
      }
    : null;
  // A state saved before there were indicators has none.
  state.watch.indicators ??= {};
  const indicators = stepIndicators(state.watch.indicators, {
    ...{ unit, model, state, taken, estimate, spread },
    time_ms: scan.time_ms,
    dt_s: taken.dt_s,
  });
  const causes = causesOf(indicators);
  followRun(model, state, taken, estimate);
  const events = stepWatch(unit, state.watch, {
    time_ms: scan.time_ms,
    mode: taken.conditions.mode,
    estimate,
    readingsSeen: taken.readings,
    drops_Pa: dropsOf(unit, scan.values),
    gas,
    run: state.watch.run,
    indicators,
    causes,
  });
  const watch = { time, unit: unit.id, indicators, causes };
  state.cycle ??= startCycleLog();
  const cycle = stepCycleLog(
    cycleRules(unit),
    state.cycle,
    cycleScanOf(model, state, taken, estimate, events),
    indicators,
  );
  const counts = countsOf(model, state, taken);
  return { estimate, profile, events, counts, watch, ...(cycle === null ? {} : { cycle }) };
}

/** What was told of the end of the discharge that runs, and what is expected of it now. */
function followRun(model: UnitModel, state: UnitState, taken: Taken, estimate: Estimate): void {
  const { unit, machine } = model;
  const { watch } = state;
  const { power_W } = taken.conditions;
  const own_W = machine.auxiliary_running_W;
  const share = (Math.abs(power_W) + own_W) / (unit.rated_power_W + own_W);
  const run = stepRunEnd(
    watch.run,
    {
      ...{ time_ms: taken.scan.time_ms, mode: estimate.mode, quality: estimate.quality, power_W },
      roughly_h: (estimate.state_of_charge * unit.rated_hours) / share,
      isNear: isOutletNear(unit, estimate),
      isAlarmed: unit.stores.some(({ id }) => watch.conditions[`${OUTLET_ALARM}/${id}`]?.raised),
    },
    {
      hours: (power) => computeHours(hoursInput(model, state, power), power).hours,
      central: (power) => centralHours(hoursInput(model, state, power), power),
    },
  );
  if (run === undefined) delete watch.run;
  else watch.run = run;
}

/** Measured pressure drop by store; null where its reading is missing. */
function dropsOf(unit: UnitDefinition, values: Float64Array): Record<string, number | null> {
  const drops: Record<string, number | null> = {};
  unit.channels.forEach(({ role }, i) => {
    if (role.kind !== 'pressure_drop') return;
    const read = values[i];
    drops[role.store] = read === undefined || Number.isNaN(read) ? null : read;
  });
  return drops;
}

function countsOf(model: UnitModel, state: UnitState, taken: Taken): ScanCounts {
  const stores = model.stores.map((store, s) => [
    store.store.id,
    countThermocouples(store, state.stores[s] as StoreState, taken.scan.values),
  ]);
  const surprise = model.stores.map((store, s) => {
    const { tubes } = state.stores[s] as StoreState;
    return [store.store.id, tubes.reduce((sum, one) => sum + one.surprise, 0) / tubes.length];
  });
  return {
    stores: Object.fromEntries(stores),
    surprise: Object.fromEntries(surprise),
    implausible: implausibleReadings(model.unit, taken.implausible),
    mode_disagrees: taken.disagrees,
    mode_disagreements: state.conditions.disagreements,
  };
}

/** A state of charge less certain than this is no guide, or not good [-]. */
const BLIND_SIGMA = 0.25;
const GOOD_SIGMA = 0.05;

function qualityOf(
  model: UnitModel,
  state: UnitState,
  taken: Taken,
  gas: readonly GasDoubt[],
): Quality {
  const age_s = state.seen_ms === null ? Infinity : (taken.scan.time_ms - state.seen_ms) / 1000;
  if (age_s > model.unit.watch.data_age_s.limit) return 'stale';
  if (taken.stores.some(({ step }) => step === 'missed' || step === 'not_started')) return 'blind';
  const used = state.stores.reduce((sum, store) => sum + store.used, 0);
  if (used === 0 && !taken.conditions.flowKnown) return 'blind';
  const settled = state.stores.every((store) => store.settled >= 10);
  const sigma = Math.max(...taken.stores.map(({ energy }) => energy.soc_sigma));
  if (sigma > BLIND_SIGMA) return 'blind';
  if (sigma > GOOD_SIGMA) return 'degraded';
  if (gas.some(({ doubtful }) => doubtful)) return 'degraded';
  if (touchesEstimate(model.unit, taken.implausible) || taken.conditions.flowStandIn)
    return 'degraded';
  if (!taken.conditions.flowKnown || used < 0.6 * model.thermocouples.length || !settled) {
    return 'degraded';
  }
  return 'good';
}
