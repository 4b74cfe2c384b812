import type { UnitDefinition } from '../../../src/core/definitions.js';
import { hold, startHold } from '../../../src/core/scan/hold.js';
import { RandomStream } from '../../../test/plant/random.js';
import { base, cycle } from '../base.js';
import type { RowPlan, Runner, Scenario } from '../scenario.js';
import { type SensorSet, unitWith } from '../sensorSets.js';
import { type Reading, runSeries } from '../series.js';
import { tally } from '../tally.js';

/** Of the recording: what scans can be chosen from [s]. */
const GRID_S = 15;

/** How a row's readings arrive. */
interface Arrival {
  readonly id: string;
  readonly words: string;
  /** Configured scan period [s]. */
  readonly period_s: number;
  /** Time from one scan to the next [s], in steps of GRID_S. */
  readonly spacing_s: (random: RandomStream) => number;
  /** What reaches the estimator of the true readings; by exception, at random, or all. */
  readonly through?: (unit: UnitDefinition, random: RandomStream) => Reporter;
  readonly prepare?: (unit: UnitDefinition) => UnitDefinition;
  /** Readings are withheld. */
  readonly missing?: true;
  /** Figures without goals. */
  readonly plain?: true;
}

type Reporter = (reading: Reading, elapsed_s: number, time_ms: number) => Reading;

const SCAN_S = 60;
const even = () => SCAN_S;
export const stepsBetween = (least_s: number, most_s: number) => (random: RandomStream) =>
  least_s + GRID_S * Math.floor(random.uniform(0, (most_s - least_s) / GRID_S + 1 - 1e-9));

/** Deadbands of a plant that saves on its network: temperatures [K]; the others as shares of their range. */
const DEADBAND_K = 1;
const DEADBAND_SHARE = 0.01;
const LONGEST_SILENCE_S = 1800;

export function byException(unit: UnitDefinition): UnitDefinition {
  const { flow_max_kg_s, power_max_W } = unit.limits.discharge;
  return {
    ...unit,
    channels: unit.channels.map((channel) => {
      const { kind } = channel.role;
      const deadband =
        kind === 'flow'
          ? DEADBAND_SHARE * flow_max_kg_s
          : kind === 'power'
            ? DEADBAND_SHARE * power_max_W
            : kind === 'thermocouple' || kind.endsWith('temperature')
              ? DEADBAND_K
              : 0;
      const reporting = { kind: 'by_exception', deadband, longest_silence_s: LONGEST_SILENCE_S };
      return { ...channel, reporting } as typeof channel;
    }),
  };
}

/** Says a value where it left the deadband about the last one said, or after half the longest silence. */
export function exceptions(unit: UnitDefinition): Reporter {
  const said = new Float64Array(unit.channels.length).fill(Number.NaN);
  const at_ms = new Float64Array(unit.channels.length).fill(Number.NEGATIVE_INFINITY);
  const state = startHold(unit);
  return (reading, _, time_ms) => {
    const values = reading.values.slice();
    const heard = new Uint8Array(values.length);
    unit.channels.forEach(({ reporting }, i) => {
      if (reporting.kind !== 'by_exception') return;
      const still = Math.abs(values[i]! - said[i]!) <= reporting.deadband;
      const silent_ms = time_ms - at_ms[i]!;
      if (still && silent_ms < (reporting.longest_silence_s * 1000) / 2) return;
      heard[i] = 1;
      said[i] = values[i]!;
      at_ms[i] = time_ms;
    });
    return { values, held: hold(unit, state, time_ms, values, heard) };
  };
}

const PRESENT = 0.2;

/** Each reading is there with a chance of 20 %, whatever it is. */
export function sparse(_: UnitDefinition, random: RandomStream): Reporter {
  return ({ values, held }) => ({
    values: values.map((v) => (random.uniform() < PRESENT ? v : Number.NaN)),
    held,
  });
}

/** When one store's thermocouples are silent [h]: over the turn from charge to discharge. */
const SILENT_H = [4.75, 5.75] as const;

export function silentStore(unit: UnitDefinition, random: RandomStream): Reporter {
  const silent = unit.stores[random.uniform() < 0.5 ? 0 : 1]!.id;
  const own = unit.channels.map((c) => 'store' in c.role && c.role.store === silent);
  return (reading, elapsed_s) => {
    const hour = elapsed_s / 3600;
    if (hour < SILENT_H[0] || hour >= SILENT_H[1]) return reading;
    return { ...reading, values: reading.values.map((v, i) => (own[i] ? Number.NaN : v)) };
  };
}

const ARRIVALS: readonly Arrival[] = [
  {
    id: 'jittered',
    words: 'every 30 to 90 s',
    period_s: SCAN_S,
    spacing_s: stepsBetween(30, 90),
  },
  {
    id: 'uneven',
    words: 'every 30 to 300 s, scan period 300 s',
    period_s: 300,
    spacing_s: stepsBetween(30, 300),
  },
  {
    id: 'late',
    words: 'every 30 to 300 s, scan period 60 s',
    period_s: SCAN_S,
    spacing_s: stepsBetween(30, 300),
    // Whoever configures so loses most of the flow.
    plain: true,
  },
  {
    id: 'exception',
    words: 'by exception, 1 K and 1 % of range',
    period_s: SCAN_S,
    spacing_s: even,
    prepare: byException,
    through: exceptions,
  },
  {
    id: 'sparse',
    words: 'each reading there with 20 %',
    period_s: SCAN_S,
    spacing_s: even,
    through: sparse,
    missing: true,
    plain: true,
  },
  {
    id: 'silent',
    words: 'one store silent for an hour',
    period_s: SCAN_S,
    spacing_s: even,
    through: silentStore,
    missing: true,
    plain: true,
  },
];

const rowsOf = (set: SensorSet, ids: readonly string[]): RowPlan[] =>
  ARRIVALS.filter((a) => ids.includes(a.id)).map((a) => ({
    id: `${set}-${a.id}`,
    set,
    errors: 'independent',
    words: a.words,
    ...(a.plain ? { plain: true } : {}),
  }));

/** One definition per row, so that what the core keeps per definition is made once. */
const units = new Map<string, UnitDefinition>();

function unitOf(plan: RowPlan, arrival: Arrival): UnitDefinition {
  const known = units.get(plan.id);
  if (known) return known;
  const plain = { ...unitWith(plan.set, plan.errors), scan_period_s: arrival.period_s };
  const unit = arrival.prepare?.(plain) ?? plain;
  units.set(plan.id, unit);
  return unit;
}

const runScans: Runner = (recording, seed, rows) =>
  Object.fromEntries(
    rows.map((plan) => {
      const arrival = ARRIVALS.find((a) => plan.id.endsWith(`-${a.id}`))!;
      const unit = unitOf(plan, arrival);
      const random = new RandomStream(seed, `score ${plan.id}`);
      const report = arrival.through?.(unit, random);
      const { period_s } = recording.header;
      let next_s = SCAN_S;
      const series = runSeries(unit, recording, {
        errors: plan.errors,
        hours: false,
        through: (reading, n) => {
          const elapsed_s = (n + 1) * period_s;
          if (elapsed_s < next_s) return null;
          next_s = elapsed_s + arrival.spacing_s(random);
          return report ? report(reading, elapsed_s, recording.time_ms(n)) : reading;
        },
      });
      // A reading that is withheld is open circuit for whoever reads it, and rightly so.
      const rejections = arrival.missing
        ? series.rejections.filter((r) => r.verdict !== 'open')
        : series.rejections;
      return [plan.id, tally({ ...series, rejections }, seed)];
    }),
  );

export const SCANS: Scenario = {
  ...base,
  id: 'scans',
  code: 'scans',
  words: 'one cycle',
  truth: {
    id: 'scans',
    machine: 'random',
    period_s: GRID_S,
    segments: cycle,
    hours_every_min: null,
  },
  every: 2,
  rows: [
    ...rowsOf('all', ['jittered', 'uneven', 'late', 'exception', 'sparse', 'silent']),
    ...rowsOf('five', ['jittered', 'exception', 'sparse']),
  ],
  run: runScans,
  hours: false,
};
