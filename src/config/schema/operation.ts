import { z } from 'zod';
import { key, positive, section, temperature_degC } from './key.js';
import { tradeLimits } from './trade.js';

const direction = z.strictObject({
  power_min_MW_el: key(z.number().min(0).max(5000), 'MW_el', 'Smallest stable power.', 0.5).default(
    0,
  ),
  power_max_MW_el: key(positive(5000), 'MW_el', 'Greatest power.', 2),
  flow_min_kg_s: key(z.number().min(0).max(1e5), 'kg/s', 'Smallest stable flow.', 6).default(0),
  flow_max_kg_s: key(positive(1e5), 'kg/s', 'Greatest flow.', 26),
});
const outlet = (what: string, example: number) =>
  key(temperature_degC(), 'degC', what, example, 'no such rule').optional();

/** What ends a discharge or a charge. */
export const limitsSchema = z.strictObject({
  charge: section(direction, 'Range of the machine while charging.'),
  discharge: section(direction, 'Range of the machine while discharging.'),
  hot_outlet_min_degC: outlet('A discharge ends when the hot outlet falls below.', 330),
  cold_outlet_max_degC: outlet('A discharge ends when the cold outlet rises above.', -60),
  charge_hot_outlet_max_degC: outlet('A charge ends when the hot store lets out more.', 90),
  charge_cold_outlet_min_degC: outlet('A charge ends when the cold store lets out less.', -20),
  pressure_drop_max_kPa: key(
    positive(1000),
    'kPa',
    'Greatest pressure drop over a store.',
    5,
    'no such rule',
  ).optional(),
  ...tradeLimits,
});

const sigma = (unit: string, most: number, what: string, usual: number) =>
  key(z.number().min(0).max(most), unit, what, usual).default(usual);

/** How much the estimator may believe; the defaults suit a plant that nobody has tuned yet. */
export const estimatorSchema = z.strictObject({
  cells: key(
    z.int().min(20).max(400),
    '-',
    'Cells of each tube along the bed; computing time grows with their square.',
    100,
  ).default(100),
  reading_sigma_K: key(positive(50), 'K', 'Noise of one thermocouple reading.', 0.5).default(0.5),
  offset_sigma_K: sigma('K', 50, 'Offset of one thermocouple.', 1),
  group_offset_sigma_K: sigma('K', 50, 'Offset that a group of thermocouples shares.', 0.5),
  offset_time_h: key(
    positive(1e5),
    'h',
    'Time over which an offset may wander by its sigma.',
    720,
  ).default(720),
  position_sigma_mm: sigma('mm', 1000, 'Uncertainty of the position of a thermocouple.', 10),
  flow_factor_sigma: sigma('-', 1, 'True over metered flow of a tube, as a share.', 0.1),
  heat_transfer_factor_sigma: sigma(
    '-',
    3,
    'Heat transfer against the correlation, in its logarithm.',
    0.5,
  ),
  gas_share: key(
    z.number().min(-1).max(1),
    '-',
    'Share of the gas temperature that a thermocouple in the bed sees, net of its lag.',
    0.3,
  ).default(0.3),
  gas_share_sigma: sigma('-', 2, 'Uncertainty of gas_share.', 0.3),
  inlet_sigma_K: sigma('K', 50, 'Uncertainty of the fluid temperature at an inlet.', 2),
  leak_sigma: sigma(
    '-',
    0.1,
    'Flow through a valve that leaks while the unit stands, as a share of the greatest discharge flow.',
    0.002,
  ),
  heat_capacity_sigma: sigma(
    '-',
    0.5,
    'Uncertainty of the heat capacity of the bed, as a share: 1.5 % for rock known to 3 % (two sigmas) and 1 % for a void fraction known to 0.012.',
    0.018,
  ),
  machine_factor_sigma: sigma(
    '-',
    0.5,
    'Uncertainty of the specific work of the machine, as a share.',
    0.03,
  ),
  stand_flow_kg_s: key(
    positive(1e4),
    'kg/s',
    'Below this flow for two scans the unit stands.',
    0.5,
    '2 % of limits.discharge.flow_max_kg_s',
  ).optional(),
});

export type LimitsBlock = z.output<typeof limitsSchema>;
export type EstimatorBlock = z.output<typeof estimatorSchema>;
