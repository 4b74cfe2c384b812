import type { PlantDraw } from '../../test/plant/draws.js';

const CLASS = '~class';

/** Name under which the truth reads a thermocouple with a given kind of errors. */
export function columnOf(thermocouple: string, errors: 'independent' | 'class'): string {
  return errors === 'class' ? `${thermocouple}${CLASS}` : thermocouple;
}

/** Twins share thermowell, mixture and offset; only one of the two has the other errors. */
export function withTwins(draw: PlantDraw): PlantDraw {
  const thermocouples = { ...draw.thermocouples };
  for (const [id, own] of Object.entries(draw.thermocouples)) {
    if (id.endsWith(CLASS)) thermocouples[id] = draw.thermocouples[id.slice(0, -CLASS.length)]!;
    else thermocouples[id] = { ...own, gain: 0, position_error_m: 0 };
  }
  return { ...draw, thermocouples };
}
