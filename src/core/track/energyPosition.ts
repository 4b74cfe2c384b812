/**
 * Energy-equivalent position of the front: where a sharp front with the same stored enthalpy would
 * stand, measured from the charge inlet.
 *
 * x_E = sum_i dx_i (H_i - H_d)/(H_c - H_d), H the enthalpy per volume of bed. It needs no crossing,
 * runs from 0 (discharged) to the bed's length (charged) and beyond where the bed is hotter or
 * colder than its references: it is not clamped. x_E / length is the state of charge.
 *
 * @param enthalpy_J_m3 H of each cell [J/m3 of bed], any zero
 * @param cell_m length of each cell, or one length for all [m]
 * @param charged_J_m3 H at the charged reference (hot for a hot store) [J/m3]
 * @param discharged_J_m3 H at the discharged reference [J/m3]
 * @returns x_E [m]
 * @throws RangeError where the two references have the same enthalpy, or lengths differ
 */
export function energyPosition(
  enthalpy_J_m3: Float64Array,
  cell_m: Float64Array | number,
  charged_J_m3: number,
  discharged_J_m3: number,
): number {
  const span = charged_J_m3 - discharged_J_m3;
  if (!Number.isFinite(span) || span === 0)
    throw new RangeError(`charged_J_m3 ${charged_J_m3} and ${discharged_J_m3} span nothing`);
  if (typeof cell_m !== 'number' && cell_m.length !== enthalpy_J_m3.length)
    throw new RangeError(`cell_m has ${cell_m.length} cells, not ${enthalpy_J_m3.length}`);
  let sum = 0;
  for (let i = 0; i < enthalpy_J_m3.length; i++) {
    const dx = typeof cell_m === 'number' ? cell_m : cell_m[i]!;
    sum += dx * (enthalpy_J_m3[i]! - discharged_J_m3);
  }
  return sum / span;
}
