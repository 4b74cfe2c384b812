import { describe, expect, it } from 'vitest';
import type { Tunable, TuneResult, TuneRow } from '../../../src/core/tune/result.js';
import { tuneUnit } from '../../../src/core/tune/tune.js';
import { ownRecording } from './ownModel.js';

function tuned(options: Parameters<typeof ownRecording>[0]): TuneResult {
  const { model, record } = ownRecording(options);
  const answer = tuneUnit(model, record);
  if ('refusal' in answer) throw new Error(answer.refusal);
  return answer.result;
}

function row(result: TuneResult, name: Tunable): TuneRow {
  return result.rows.find((one) => one.name === name)!;
}

/** Charge, rest with the front halfway, discharge in part load, charge again. */
const WITH_REST = [
  [4.5, 4],
  [0, 10],
  [-3, 3],
  [5, 2],
] as const;
const WITHOUT_REST = [
  [4.5, 4],
  [-3, 4],
  [5, 3],
] as const;

describe('a recording of the very model that is fitted, without noise', () => {
  const planted = { transfer: -0.3, conductivity: 0.35, loss: 0.3, share: 0.6, lag_s: 80 };
  const result = tuned({ plan: WITH_REST, guess: planted, flow: [0.03, -0.01], work: 1.04 });

  it('gives the planted factors back', () => {
    // What is left is the pull of the priors: a value known to sigma before and s after moves by
    // (s/sigma)^2 of its distance from the configuration, a fifth for the conductivity, a hundredth for
    // the transfer, and the start between thermocouples adds to it.
    for (const [name, value, most] of [
      ['heat_transfer', planted.transfer, 0.02],
      ['conductivity', planted.conductivity, 0.2 * planted.conductivity],
      ['loss', planted.loss, 0.1],
    ] as const) {
      expect(Math.abs(Math.log(row(result, name).value) - value), name).toBeLessThan(most);
    }
    const share = row(result, 'gas_share');
    expect(share.value).toBeGreaterThan(0);
  });

  it("gives the fronts' travel and the work per metered kilogram", () => {
    const { model } = ownRecording({ plan: [[4, 0.1]] });
    const shares = model.unit.stores[0]!.strings.map((string) => string.area_share);
    const travel = row(result, 'front_travel');
    const planted = 0.03 * shares[0]! - 0.01 * shares[1]!;
    expect(Math.abs(Math.log(travel.value) - planted)).toBeLessThan(travel.sigma!);
    for (const name of ['work_charge', 'work_discharge'] as const) {
      const work = row(result, name);
      // No noise: the pull of the machine's prior (1.8 %) against the outlets' uncertainty alone.
      const pull = (work.sigma! / 0.018) ** 2 * Math.log(1.04);
      expect(Math.abs(Math.log(work.value / 1.04)), name).toBeLessThan(pull + 1e-6);
    }
  });

  it('has a covariance: correlations within one, symmetric, one with itself', () => {
    result.correlations.forEach((line, i) => {
      line.forEach((r, j) => {
        expect(Math.abs(r)).toBeLessThanOrEqual(1 + 1e-9);
        expect(r).toBeCloseTo(result.correlations[j]![i]!, 9);
      });
      expect(line[i]).toBe(1);
    });
    for (const { sigma } of result.rows) expect(sigma).toBeGreaterThan(0);
  });

  it('follows every thermocouple and leaves none out', () => {
    expect(result.fits[0]!.left_out).toEqual([]);
    expect(result.fits[0]!.residual_K).toBeLessThan(1);
  });
});

describe('what a recording cannot determine is named', () => {
  it('a constant meter error against the heat capacity, where no power is read', () => {
    const result = tuned({ plan: WITHOUT_REST, flow: [-0.05, -0.05], work: null });
    for (const name of ['true_over_metered_flow', 'heat_capacity'] as const) {
      expect(row(result, name)).toMatchObject({
        determined: false,
        reason: 'meter_or_heat_capacity',
      });
    }
    expect(row(result, 'work_charge').reason).toBe('no_power_that_way');
    // The travel, which both share, is found: a front that goes 5 % less far.
    const travel = row(result, 'front_travel');
    expect(travel.determined).toBe(true);
    expect(Math.log(travel.value)).toBeCloseTo(-0.05, 2);
    expect(result.configure.stores[0]!.heat_capacity).toBeNull();
    expect(result.configure.work_factor).toEqual({ charge: null, discharge: null });
    // And without a rest neither conduction nor losses.
    expect(row(result, 'conductivity').reason).toBe('no_standing');
    expect(['no_standing', 'no_string_near_wall']).toContain(row(result, 'loss').reason);
    expect(row(result, 'heat_transfer').determined).toBe(true);
  });
});

describe('nothing can be tuned', () => {
  it('to a recording that is too short, stands, or is empty', () => {
    const refusal = (plan: Parameters<typeof ownRecording>[0]['plan']) => {
      const { model, record } = ownRecording({ plan });
      return tuneUnit(model, record);
    };
    expect(refusal([[4, 2]])).toEqual({ refusal: 'too_short' });
    expect(
      refusal([
        [4, 0.5],
        [0, 8],
      ]),
    ).toEqual({ refusal: 'no_flow' });
    const { model, record } = ownRecording({ plan: [[4, 4]] });
    expect(tuneUnit(model, { ...record, bins: [] })).toEqual({ refusal: 'no_rows' });
    const blank = record.bins.map((bin) => ({
      ...bin,
      readings: [bin.readings[0]!.map(() => Number.NaN)],
    }));
    expect(tuneUnit(model, { ...record, bins: blank })).toEqual({ refusal: 'no_thermocouples' });
  });
});
