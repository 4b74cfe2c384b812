import { describe, expect, it } from 'vitest';
import { commandOf } from '../../../src/core/plan/command.js';
import { createOutlook } from '../../../src/core/plan/outlook.js';
import { spreadOf } from '../../../src/core/plan/spread.js';
import { contextOf, H, unit } from './offerUnit.js';

describe('the rule of the greatest flow', () => {
  // The flow runs away where the machine's work goes to nothing, all within one step.
  it('has a time about as sure as that of the outlets, at low power too', () => {
    const { model, state, before } = contextOf({ hot: 0.458, cold: 0.474 });
    for (const power_W of [18.75e3, 22.5e3, 30e3]) {
      const leg = {
        mode: 'discharge',
        power_W,
        from_s: 0,
        to_s: Number.POSITIVE_INFINITY,
      } as const;
      const command = commandOf(unit, [leg], [], before, 24 * H * (60e3 / power_W));
      const { times, covariance } = spreadOf(
        createOutlook(model, state, power_W / unit.rated_power_W),
        command,
      );
      const sigma = (cause: string): number => {
        const i = times.findIndex((q) => q.cause === cause);
        return Math.sqrt(covariance[i]?.[i] as number);
      };
      expect(sigma('flow')).toBeLessThan(1.3 * sigma('cold_outlet'));
      expect(sigma('flow')).toBeGreaterThan(0.7 * sigma('cold_outlet'));
    }
  });
});
