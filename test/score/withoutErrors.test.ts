import { describe, expect, it } from 'vitest';
import { unitWith } from '../../tools/score/sensorSets.js';
import { truthGeometry } from '../../tools/score/truthPlant.js';
import { columnOf, withTwins } from '../../tools/score/twins.js';
import { ERRORS, withoutErrors } from '../../tools/sigma/without.js';
import { drawPlant, groupError } from '../plant/draws.js';

const unit = unitWith('all', 'class');
const draw = withTwins(
  drawPlant(truthGeometry(), 3, {
    physics: 'random',
    machine: 'random',
    sensors: 'class',
    meter: 'random',
  }),
);
const SCAN = 700;
const PERIOD_S = 60;
/** True temperature at a channel [K]. */
const trueAt = (i: number) => 180 + 5 * (i % 100);
const isGas = (i: number) => unit.channels[i]!.role.kind === 'gas_temperature';
const isSensor = (i: number) => unit.channels[i]!.role.kind === 'thermocouple';

/** Reading of a channel with the errors named, written down forwards. */
function reading(i: number, errors: readonly string[]): number {
  const T = trueAt(i);
  const { id } = unit.channels[i]!;
  if (isGas(i)) return T + (errors.includes('gas') ? draw.gasSensors[id]!.offset_K : 0);
  if (!isSensor(i)) return T;
  const own = draw.thermocouples[columnOf(id, 'class')]!;
  const thermocouple = unit.stores
    .flatMap((s) => s.strings.flatMap((t) => t.thermocouples))
    .find((t) => t.id === id)!;
  const swing = groupError(draw.groups[thermocouple.group!]!, (SCAN + 1) * PERIOD_S);
  return (
    T +
    (errors.includes('offset') ? own.offset_K : 0) +
    (errors.includes('gain') ? own.gain * (T - 273.15) : 0) +
    (errors.includes('group') ? swing : 0)
  );
}

const worst = (a: Float64Array, b: Float64Array) =>
  a.reduce((most, v, i) => Math.max(most, Math.abs(v - b[i]!)), 0);
const all = (errors: readonly string[]) =>
  Float64Array.from(unit.channels, (_, i) => reading(i, errors));

describe('readings without some of their errors', () => {
  it.each(ERRORS)('takes %s out and leaves the others', (error) => {
    const through = withoutErrors(unit, draw, 'class', PERIOD_S, new Set([error]));
    const held = new Uint8Array(unit.channels.length);
    const found = through({ values: all(ERRORS), held }, SCAN)!;
    expect(worst(found.values, all(ERRORS.filter((e) => e !== error)))).toBeLessThan(1e-9);
    // Each is there to be taken out.
    expect(worst(found.values, all(ERRORS))).toBeGreaterThan(0.05);
  });

  it('leaves temperatures alone that have no error left, and everything where none is named', () => {
    const through = withoutErrors(unit, draw, 'class', PERIOD_S, new Set(ERRORS));
    const held = new Uint8Array(unit.channels.length);
    const found = through({ values: all(ERRORS), held }, SCAN)!;
    expect(worst(found.values, all([]))).toBeLessThan(1e-9);
    const untouched = withoutErrors(unit, draw, 'class', PERIOD_S, new Set());
    expect(untouched({ values: all(ERRORS), held }, SCAN)!.values).toEqual(all(ERRORS));
  });
});
