import { z } from 'zod';
import { stringSchema } from './channels.js';
import { id, key, positive, section, temperature_degC } from './key.js';
import { fluidSchema, solidSchema } from './materials.js';

const bed = z.strictObject({
  height_m: key(positive(200).min(0.05), 'm', 'Length of the bed along the flow.', 8),
  diameter_m: key(positive(200).min(0.02), 'm', 'Inner diameter of the bed.', 6),
  particle_diameter_mm: key(
    positive(500).min(0.1),
    'mm',
    'Diameter of a sphere of the same volume as a piece.',
    20,
  ),
  particle_shape: key(
    z.enum(['crushed', 'sphere']),
    '-',
    'Shape of the pieces, for conduction through the bed.',
    'crushed',
  ).default('crushed'),
  void_fraction: key(
    z.number().min(0.1).max(0.9),
    '-',
    'Share of the bed that the fluid fills.',
    0.4,
  ),
  solid: solidSchema,
  fluid: fluidSchema,
});

const factor = (what: string) =>
  key(
    z.number().min(0.05).max(20),
    '-',
    `Factor on the published correlation: ${what}.`,
    1,
  ).default(1);
const factors = z.strictObject({
  heat_transfer: factor('heat transfer between fluid and solid'),
  conductivity: factor('axial conduction'),
  pressure_drop: factor('pressure drop'),
  heat_capacity: factor('heat capacity of the solid'),
  loss: factor('heat losses'),
  gas_share: key(
    z.number().min(-1).max(1),
    '-',
    'Share of the gas temperature that the thermocouples of this store see, net of their lag.',
    0.1,
    'estimator.gas_share',
  ).optional(),
});

const coefficient = (where: string) =>
  key(
    z.number().min(0).max(100),
    'W/m2K',
    `Heat loss through ${where} to ambient, per area of the bed there.`,
    0.3,
  ).default(0.3);
const losses = z.strictObject({
  wall_W_m2K: coefficient('the mantle'),
  wall_steel_kJ_m2K: key(
    z.number().min(0).max(2000),
    'kJ/m2K',
    'Heat capacity of the vessel wall inside its insulation, per area; 15 mm of steel have 59. 0: not counted.',
    59,
  ).default(0),
  charge_inlet_end_W_m2K: coefficient('the end at the charge inlet'),
  discharge_inlet_end_W_m2K: coefficient('the end at the discharge inlet'),
});

const steel = (where: string) =>
  key(
    z.number().min(0).max(1e6),
    'kJ/K',
    `Heat capacity of plenum and lid steel at the ${where}.`,
    500,
  ).default(0);
const plenum = (where: string) =>
  key(z.number().min(0).max(1e4), 'm3', `Free volume at the ${where}.`, 8).default(0);
const ends = z.strictObject({
  charge_inlet_steel_kJ_K: steel('charge inlet'),
  discharge_inlet_steel_kJ_K: steel('discharge inlet'),
  charge_inlet_volume_m3: plenum('charge inlet'),
  discharge_inlet_volume_m3: plenum('discharge inlet'),
});

/** One packed bed with its strings. */
export const storeSchema = z.strictObject({
  id: key(id(), '-', 'Name of the store, unique in its unit.', 'hot'),
  kind: key(z.enum(['hot', 'cold']), '-', 'hot stores heat, cold stores cold.', 'hot'),
  charge_inlet_at: key(
    z.enum(['top', 'bottom']),
    '-',
    'End where the fluid enters while charging: x = 0.',
    'top',
  ),
  reference_hot_degC: key(
    temperature_degC(),
    'degC',
    'Upper reference: a hot store charged, a cold store discharged.',
    460,
  ),
  reference_cold_degC: key(
    temperature_degC(),
    'degC',
    'Lower reference: a hot store discharged, a cold store charged.',
    30,
  ),
  pressure_bar: key(
    positive(400).min(0.05),
    'bar',
    'Absolute pressure of the fluid in this store.',
    7.9,
  ),
  bed: section(bed, 'Geometry and filling of the bed.'),
  factors: section(factors.prefault({}), 'Factors tuned to the plant.'),
  losses: section(losses.prefault({}), 'Heat losses to ambient.'),
  ends: section(ends.prefault({}), 'Steel and free volume at the two ends.'),
  strings: section(
    z.array(section(stringSchema, 'A line of thermocouples.')).min(1).max(60),
    'Thermocouple strings; each stands for a stream tube of the bed.',
  ),
});

export type StoreBlock = z.output<typeof storeSchema>;
