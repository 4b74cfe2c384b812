import { dewPoint_K } from '../../config/dewPoint.js';
import { axialConductivity, stagnantConductivity } from '../../core/bed/bedConductivity.js';
import {
  biot,
  prandtl,
  reynolds,
  volumetricHeatTransfer,
  wakaoCovers,
} from '../../core/bed/heatTransfer.js';
import { pressureDrop } from '../../core/bed/pressureDrop.js';
import { bedEnthalpyFunction, liquidSolidShare } from '../../core/bed/tables.js';
import type { StoreDefinition } from '../../core/definitions.js';
import { ZERO_CELSIUS_K } from '../../core/units.js';

const J_PER_MWH = 3.6e9;
const HOUR_S = 3600;

/** What an engineer would reckon by hand of a store; units in the names. */
export interface StoreFacts {
  readonly id: string;
  readonly kind: string;
  readonly volume_m3: number;
  readonly solid_t: number;
  /** Enthalpy between the two references, liquid included. */
  readonly capacity_MWh_th: number;
  /** Mean over the span of the references [kJ/m3K]. */
  readonly heat_capacity_kJ_m3K: number;
  readonly flow_kg_s: number;
  readonly mass_flux_kg_m2s: number;
  readonly reynolds: number;
  readonly prandtl: number;
  readonly correlation_covers: boolean;
  readonly biot: number;
  readonly heat_transfer_kW_m3K: number;
  readonly ntu: number;
  readonly stagnant_conductivity_W_mK: readonly [cold: number, hot: number];
  readonly front_speed_m_h: number;
  readonly full_charge_h: number;
  readonly front_width_m: number;
  readonly front_width_by_transfer_m: number;
  readonly front_width_by_conduction_m: number;
  /** Greatest distance between neighbouring thermocouples of a string. */
  readonly spacing_m: number | null;
  /** Fewest thermocouples of a string between the 16 and 84 % crossings of such a front. */
  readonly thermocouples_per_front: number;
  readonly pressure_drop_charged_kPa: number;
  readonly pressure_drop_discharged_kPa: number;
  readonly standing_loss_kW: number;
  readonly standing_loss_percent_d: number;
  /** Null for a liquid, or a gas without a dew line. */
  readonly dew_point_degC: number | null;
  readonly coldest_degC: number;
  readonly strings: readonly {
    readonly id: string;
    readonly area_share: number;
    readonly thermocouples: number;
  }[];
}

/**
 * Facts of a store at one flow, with properties at the mean of the references. The front after a
 * full charge: sigma^2 = 2 D t, D = (s G cf)^2/(hv C) + k_ax/C, t = L/v, with the plug-flow speed
 * v = G dh_f/dH and s the solid's share of the heat capacity (1 for a gas).
 *
 * @param coldest_K lowest temperature of the gas in this store
 */
export function storeFacts(
  store: StoreDefinition,
  flow_kg_s: number,
  ambient_K: number,
  coldest_K: number,
): StoreFacts {
  const { bed, reference_hot_K: hot, reference_cold_K: cold } = store;
  const span = hot - cold;
  const mean = (hot + cold) / 2;
  const volume = bed.area_m2 * bed.length_m;
  const H = bedEnthalpyFunction(bed);
  const content = H(hot) - H(cold);
  const C = content / span;
  const G = flow_kg_s / bed.area_m2;
  const carried = bed.fluid.enthalpy(hot) - bed.fluid.enthalpy(cold);
  const cf = carried / span;
  const hv = volumetricHeatTransfer({ bed, massFlux_kg_m2s: G, temperature_K: mean });
  const speed = (G * carried) / content;
  const time = bed.length_m / speed;
  const byTransfer = (liquidSolidShare(bed, mean) * G * cf) ** 2 / (hv * C);
  const byConduction = axialConductivity(bed, G, mean) / C;
  const width = (dispersion: number) => Math.sqrt(2 * dispersion * time);
  const sigma = width(byTransfer + byConduction);
  const charged = store.kind === 'hot' ? hot : cold;
  const discharged = store.kind === 'hot' ? cold : hot;
  const loss = lossConductance_W_K(store) * Math.abs(charged - ambient_K);
  const dew = dewPoint_K(bed.fluid, bed.pressure_Pa);
  const drop = (temperature_K: number) => pressureDrop(bed, G, [temperature_K]) / 1e3;
  const spacings = store.strings.map(largestSpacing_m).filter((s) => s !== null);
  const spacing = spacings.length === 0 ? null : Math.max(...spacings);
  return {
    id: store.id,
    kind: store.kind,
    volume_m3: volume,
    solid_t: (volume * (1 - bed.void_fraction) * bed.solid.density_kg_m3) / 1e3,
    capacity_MWh_th: (content * volume) / J_PER_MWH,
    heat_capacity_kJ_m3K: C / 1e3,
    flow_kg_s,
    mass_flux_kg_m2s: G,
    reynolds: reynolds(bed, G, mean),
    prandtl: prandtl(bed, mean),
    correlation_covers: wakaoCovers(reynolds(bed, G, mean)),
    biot: biot(bed, G, mean),
    heat_transfer_kW_m3K: hv / 1e3,
    ntu: (hv * bed.length_m) / (G * cf),
    stagnant_conductivity_W_mK: [cold, hot].map(
      (t) => bed.conductivity_factor * stagnantConductivity(bed, t),
    ) as [number, number],
    front_speed_m_h: speed * HOUR_S,
    full_charge_h: time / HOUR_S,
    front_width_m: sigma,
    front_width_by_transfer_m: width(byTransfer),
    front_width_by_conduction_m: width(byConduction),
    spacing_m: spacing,
    thermocouples_per_front: Math.min(
      ...store.strings.map((s) => {
        const gap = largestSpacing_m(s);
        return gap === null ? 0 : (2 * sigma) / gap;
      }),
    ),
    pressure_drop_charged_kPa: drop(charged),
    pressure_drop_discharged_kPa: drop(discharged),
    standing_loss_kW: loss / 1e3,
    standing_loss_percent_d: (100 * loss * 24 * HOUR_S) / (content * volume),
    dew_point_degC: dew === null ? null : dew - ZERO_CELSIUS_K,
    coldest_degC: coldest_K - ZERO_CELSIUS_K,
    strings: store.strings.map((s) => ({
      id: s.id,
      area_share: s.area_share,
      thermocouples: s.thermocouples.length,
    })),
  };
}

/** Heat loss of a store per kelvin above ambient [W/K]: mantle and both ends. */
export function lossConductance_W_K(store: StoreDefinition): number {
  const { bed } = store;
  const mantle = Math.PI * bed.diameter_m * bed.length_m * bed.wall_loss_W_m2K;
  const ends = bed.area_m2 * (bed.end_loss_W_m2K.charge_inlet + bed.end_loss_W_m2K.discharge_inlet);
  return bed.loss_factor * (mantle + ends);
}

/** Null for a string of one thermocouple. */
function largestSpacing_m(string: StoreDefinition['strings'][number]): number | null {
  const x = string.thermocouples.map((t) => t.position_m);
  const gaps = x.slice(1).map((at, i) => at - x[i]!);
  return gaps.length === 0 ? null : Math.max(...gaps);
}
