import { readFileSync } from 'node:fs';

/**
 * The measured stores as configurations and recordings: temperatures as published (sources in the
 * fixtures' heads), one channel per digitised height; flow and inlet rows are constructed and
 * marked so in `constructed`.
 */
export interface MeasuredPoint {
  readonly time_s: number;
  readonly height_m: number;
  readonly value_degC: number;
}

export function readPoints(file: string, columns: { time: number; height: number; value: number }) {
  const text = readFileSync(new URL(`../../fixtures/${file}`, import.meta.url), 'utf8');
  return text
    .split('\n')
    .filter((line) => /^[0-9]/.test(line))
    .map((line): MeasuredPoint => {
      const cells = line.split(',').map(Number);
      return {
        time_s: Math.round((cells[columns.time] as number) * 3600),
        height_m: cells[columns.height] as number,
        value_degC: cells[columns.value] as number,
      };
    });
}

export const sandiaPoints = (): MeasuredPoint[] =>
  readPoints('sandia_pacheco2002_discharge_measured.csv', { time: 0, height: 1, value: 2 });
export const meierPoints = (): MeasuredPoint[] =>
  readPoints('meier1991_rockbed_air_charge_measured.csv', { time: 0, height: 1, value: 3 });

/** Heights without repetition, ascending [m]. */
export function heightsOf(points: readonly MeasuredPoint[]): number[] {
  return [...new Set(points.map((p) => p.height_m))].sort((a, b) => a - b);
}

export const channelOf = (height_m: number): string => `T_${Math.round(height_m * 1e6)}`;

/**
 * Recording: a row each `every_s` from `from_s` to `to_s` with flow and gas temperature at the
 * inlet (constructed), and the measured readings at their own times.
 */
export function recordingOf(
  points: readonly MeasuredPoint[],
  constructed: { flow_kg_s: number; inlet: string; inlet_degC: number },
  span: { from_s: number; to_s: number; every_s: number },
  extra: readonly { time_s: number; values: Record<string, number> }[] = [],
): { header: string[]; rows: string[][]; csv: string } {
  const channels = heightsOf(points).map(channelOf);
  const header = ['time', 'flow', constructed.inlet, ...channels];
  const rows: string[][] = [];
  for (let t = span.from_s; t <= span.to_s; t += span.every_s) {
    const values: Record<string, number> = {};
    for (const p of points) if (p.time_s === t) values[channelOf(p.height_m)] = p.value_degC;
    for (const e of extra) if (e.time_s === t) Object.assign(values, e.values);
    rows.push([
      String(t),
      String(constructed.flow_kg_s),
      String(constructed.inlet_degC),
      ...channels.map((id) => (values[id] === undefined ? '' : String(values[id]))),
    ]);
  }
  const csv = [header, ...rows].map((row) => row.join(',')).join('\r\n');
  return { header, rows, csv: `${csv}\r\n` };
}

const list = (values: readonly (number | string)[]): string => `[${values.join(', ')}]`;

/** Sandia tank (Pacheco, Showalter, Kolb 2002); properties from the fixture's head. */
export function sandiaSite(points: readonly MeasuredPoint[]): string {
  const heights = heightsOf(points);
  return `name: measured thermocline
units:
  - id: tank
    scan_period_s: 60
    rated_power_MW_el: 0.25
    rated_hours_h: 2.5
    ambient_degC: 20
    machine:
      kind: efficiency_table
      fluid: &salt
        given_as: liquid
        name: nitrate salt 60/40
        source: Pacheco, Showalter & Kolb 2002
        density_kg_m3: 1835.6
        heat_capacity_J_kgK: 1511.8
        viscosity_mPa_s: 2.63
        conductivity_W_mK: 0.52
      outlet_degC: [340, 396]
      efficiency: [0.215, 0.26]
      return_degC: 290
      charge_inlet_degC: 396
      charge_efficiency: 0.98
      auxiliary_running_kW: 0
      auxiliary_standing_kW: 0
    limits:
      charge: { power_max_MW_el: 1.5, flow_max_kg_s: 10 }
      discharge: { power_max_MW_el: 0.3, flow_max_kg_s: 10 }
      hot_outlet_min_degC: 360
    estimator:
      reading_sigma_K: 3 # scatter of 3 to 5 K and non-monotonic points: the fixture's head
      offset_sigma_K: 1
    stores:
      - id: tank
        kind: hot
        charge_inlet_at: top
        reference_hot_degC: 396
        reference_cold_degC: 290
        pressure_bar: 1.0
        bed:
          height_m: 6.1
          diameter_m: 3.0
          particle_diameter_mm: 15
          void_fraction: 0.22
          solid:
            given_as: table
            name: quartzite and silica sand
            source: Pacheco, Showalter & Kolb 2002
            density_kg_m3: 2640
            conductivity_W_mK: 2.5
            temperature_degC: [290, 396]
            heat_capacity_J_kgK: [1050, 1050]
          fluid: *salt
        losses: { wall_W_m2K: 0.3, charge_inlet_end_W_m2K: 1.0, discharge_inlet_end_W_m2K: 0.3 }
        strings:
          - id: centre
            radius_m: 0
            measured_from: bottom
            positions_m: ${list(heights)}
            ids: ${list(heights.map(channelOf))}
    channels:
      - { id: flow, measures: flow, sense: signed }
      - { id: T_bottom, measures: gas_temperature, store: tank, end: discharge_inlet }
`;
}

/** Rock bed with hot air (Meier, Winkler, Wuillemin 1991); properties from the fixture's head. */
export function meierSite(points: readonly MeasuredPoint[]): string {
  const heights = heightsOf(points);
  return `name: measured rock bed
units:
  - id: bed
    scan_period_s: 60
    rated_power_MW_el: 0.001
    rated_hours_h: 2
    ambient_degC: 25
    machine:
      kind: efficiency_table
      fluid: air
      outlet_degC: [300, 550]
      efficiency: [0.15, 0.25]
      return_degC: 30
      charge_inlet_degC: 545
      charge_efficiency: 0.95
      auxiliary_running_kW: 0
      auxiliary_standing_kW: 0
    limits:
      charge: { power_max_MW_el: 0.01, flow_max_kg_s: 0.01 }
      discharge: { power_max_MW_el: 0.01, flow_max_kg_s: 0.01 }
      hot_outlet_min_degC: 300
    estimator:
      reading_sigma_K: 3 # the fixture's head: assume 3 K and 5 mm
      position_sigma_mm: 5
      stand_flow_kg_s: 0.0005
    stores:
      - id: bed
        kind: hot
        charge_inlet_at: top
        reference_hot_degC: 545
        reference_cold_degC: 30
        pressure_bar: 1.013
        bed:
          height_m: 1.2
          diameter_m: 0.15
          particle_diameter_mm: 20
          void_fraction: 0.40
          solid:
            given_as: table
            name: rock
            source: Meier et al. 1991
            density_kg_m3: 2800
            conductivity_W_mK: 2.5
            temperature_degC: [20, 600]
            heat_capacity_J_kgK: [1030, 1030]
          fluid: air
        losses: { wall_W_m2K: 0.678, charge_inlet_end_W_m2K: 0, discharge_inlet_end_W_m2K: 0 }
        strings:
          - id: axis
            radius_m: 0
            measured_from: bottom
            positions_m: ${list(heights)}
            ids: ${list(heights.map(channelOf))}
    channels:
      - { id: flow, measures: flow, sense: signed }
      - { id: T_in, measures: gas_temperature, store: bed, end: charge_inlet }
`;
}
