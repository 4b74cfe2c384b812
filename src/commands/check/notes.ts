import type { UnitDefinition } from '../../core/definitions.js';
import type { Machine } from '../../core/machine/machine.js';
import { ZERO_CELSIUS_K } from '../../core/units.js';
import { referenceOutlets } from './referenceOutlets.js';
import type { UnitFacts } from './unitFacts.js';

/** Below this distance to the dew point [K] droplets may form in a cold corner. */
const DEW_MARGIN_K = 10;
/** Fewer thermocouples across a front tell its place, but hardly its width. */
const FEW_PER_FRONT = 2;
/** Machine and references may differ by this share of the span before it is worth a word. */
const REFERENCE_SHARE = 0.03;

/** Things in a sound configuration that a person should look at. */
export function notesOf(
  unit: UnitDefinition,
  machine: Machine,
  facts: Omit<UnitFacts, 'missing' | 'missing_limits' | 'notes'>,
): string[] {
  return [
    ...ratedNotes(facts),
    ...capNotes(unit, machine),
    ...startNotes(unit),
    ...unit.stores.flatMap((store, s) => storeNotes(unit, store, facts, s)),
  ];
}

function ratedNotes(facts: Omit<UnitFacts, 'missing' | 'missing_limits' | 'notes'>): string[] {
  const notes: string[] = [];
  const { discharge, charge } = facts.cycle;
  if (facts.discharge.flow_kg_s === null) {
    notes.push('no flow gives the rated power, even with both stores full');
  }
  if (discharge.hours < facts.rated_hours_h) {
    notes.push(
      `a settled cycle gives ${discharge.hours.toFixed(1)} h at rated power, less than the rated ${facts.rated_hours_h} h (ended by ${discharge.ends_by})`,
    );
  }
  if (charge.ends_by === 'empty' || charge.ends_by === 'time') {
    notes.push(
      `the charge of the settled cycle ended by ${charge.ends_by}, not by a store being full`,
    );
  }
  return notes;
}

/**
 * Towards the end of a charge the cold outlet falls, and with it what the compressor sends on top
 * of the hot store: a discharge begins with that gas.
 */
function capNotes(unit: UnitDefinition, machine: Machine): string[] {
  const { charge_cold_outlet_min_K: cold_K, hot_outlet_min_K: least_K } = unit.limits;
  if (cold_K === null || least_K === null) return [];
  const outlets = { ...referenceOutlets(unit, 'charge'), cold_K };
  const sent_K = machine.operate('charge', outlets, unit.ambient_K).inlets.hot_K;
  if (sent_K >= least_K) return [];
  return [
    `a charge down to charge_cold_outlet_min_degC ends with ${degC(sent_K)} into the hot store, below hot_outlet_min_degC (${degC(least_K)}): the discharge after it would end at once`,
  ];
}

/** A start that draws more than a window lets in cannot be made while that is open. */
export function startNotes(unit: UnitDefinition): string[] {
  const { operation, connection } = unit.limits;
  if (operation === undefined || connection === undefined) return [];
  return (['warm', 'cold'] as const).flatMap((kind) => {
    const { time_s, energy_J } = operation.start[kind];
    const draw_W = time_s > 0 ? energy_J / time_s : 0;
    const narrow = connection.windows.filter((window) => window.import_max_W < draw_W);
    if (narrow.length === 0) return [];
    const least = Math.min(...narrow.map((window) => window.import_max_W));
    const where =
      narrow.length === 1 ? 'a window of the connection lets' : 'windows of the connection let';
    return [
      `a ${kind} start draws ${(draw_W / 1e6).toFixed(3)} MW_el, more than ${where} in (${(least / 1e6).toFixed(3)} MW_el)`,
    ];
  });
}

const degC = (kelvin: number) => `${(kelvin - ZERO_CELSIUS_K).toFixed(0)} degC`;

function storeNotes(
  unit: UnitDefinition,
  store: UnitDefinition['stores'][number],
  facts: Omit<UnitFacts, 'missing' | 'missing_limits' | 'notes'>,
  s: number,
): string[] {
  const f = facts.stores[s]!;
  const { bed } = store;
  const notes: string[] = [];
  if (f.dew_point_degC !== null && f.coldest_degC - f.dew_point_degC < DEW_MARGIN_K) {
    notes.push(
      `HAZARD: the gas in ${f.id} comes within ${(f.coldest_degC - f.dew_point_degC).toFixed(0)} K of its dew point`,
    );
  }
  if (f.thermocouples_per_front < FEW_PER_FRONT) {
    notes.push(
      `${f.id}: ${f.thermocouples_per_front.toFixed(1)} thermocouples per front tell where it is, but hardly how wide`,
    );
  }
  if (!f.correlation_covers) {
    notes.push(
      `${f.id}: Re ${f.reynolds.toFixed(1)} is outside the measured range of the heat-transfer correlation (15 to 8500): tune factors.heat_transfer`,
    );
  }
  for (const [what, range] of [
    [bed.solid.name, bed.solid.range_K],
    [bed.fluid.name, bed.fluid.range_K],
  ] as const) {
    const low = f.coldest_degC + ZERO_CELSIUS_K;
    if (low < range[0] - 0.5 || store.reference_hot_K > range[1] + 0.5) {
      notes.push(
        `${f.id}: the data of ${what} cover ${degC(range[0])} to ${degC(range[1])}, the store runs from ${degC(low)} to ${degC(store.reference_hot_K)}; beyond the data the model continues them`,
      );
    }
  }
  const limit = unit.limits.pressure_drop_max_Pa;
  const drop_kPa = Math.max(f.pressure_drop_charged_kPa, f.pressure_drop_discharged_kPa);
  if (limit !== null && drop_kPa * 1e3 > limit) {
    notes.push(
      `${f.id}: ${drop_kPa.toFixed(2)} kPa at rated flow exceed limits.pressure_drop_max_kPa (${limit / 1e3})`,
    );
  }
  const charged_K = store.kind === 'hot' ? store.reference_hot_K : store.reference_cold_K;
  const sent = store.kind === 'hot' ? facts.charge.hot_inlet_degC : facts.charge.cold_inlet_degC;
  const span = store.reference_hot_K - store.reference_cold_K;
  if (sent !== null && Math.abs(sent + ZERO_CELSIUS_K - charged_K) > REFERENCE_SHARE * span) {
    notes.push(
      `${f.id}: the machine charges with ${sent.toFixed(0)} degC, its reference for charged is ${degC(charged_K)}`,
    );
  }
  return notes;
}
